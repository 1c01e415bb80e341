"""The ranking against a direct sum over a grid of grey scales, and against what must hold exactly."""

from __future__ import annotations

import numpy as np
import pytest

from phaseid.inference.departure import smooth_departure
from phaseid.inference.observations import Blend, Observation, dark_level
from phaseid.inference.ranking import rank

from .conftest import candidate_set, no_departure, question


def by_grid(candidates, greys, se, known, none_weight=0.05):
    """The design's formula, written out: a loop over offset and gain, no particles, no look-up."""
    upper = candidates.axis.nodes[-1]
    count = candidates.size
    greys = np.asarray(greys, dtype=float)
    # The line is laid through the darkest and the brightest grey at every pair of signals.
    axis = np.linspace(1e-4, upper, 700)
    low, high = np.meshgrid(axis, axis, indexing="ij")
    ok = high > low + 1e-6
    low, high = low[ok], high[ok]
    gain = (greys.max() - greys.min()) / (high - low)
    offset = greys.min() - gain * low
    # dO dG = gain^3 / (difference of greys) dlow dhigh, times the prior 1/gain.
    log_weight = 2 * np.log(gain)
    parts = []
    for k, grey in enumerate(greys):
        sd = np.sqrt(se**2 + (gain[:, None] * candidates.own_sd[None, :]) ** 2)
        gap = grey - offset[:, None] - gain[:, None] * candidates.signal[None, :]
        density = np.exp(-0.5 * (gap / sd) ** 2) / (sd * np.sqrt(2 * np.pi))
        if k in known:
            share = np.zeros(count)
            share[known[k]] = 1.0
            joint, none = density * share, np.zeros(len(gain))
        else:
            joint = density * (1 - none_weight) / count
            signal = (grey - offset) / gain
            none = np.where((signal >= 0) & (signal <= upper), none_weight / upper / gain, 0.0)
        total = joint.sum(axis=1) + none
        parts.append((joint, none, total))
        log_weight = log_weight + np.log(total + 1e-300)
    weight = np.exp(log_weight - log_weight.max())
    weight /= weight.sum()
    probability = np.stack(
        [weight @ (joint / (total + 1e-300)[:, None]) for joint, _, total in parts]
    )
    none = np.array([weight @ (n / (total + 1e-300)) for _, n, total in parts])
    return probability, none


@pytest.mark.parametrize("known", [{}, {3: 5}, {0: 0, 3: 5}, {0: 0, 1: 2, 3: 5}])
def test_agrees_with_direct_sum(few, known):
    greys = [30.0, 95.0, 140.0, 226.0]
    answer = rank(question(few, greys, se=1.0, known=known), effective=20000.0)
    expected, none = by_grid(few, greys, 1.0, known)
    free = [k for k in range(4) if k not in known]
    assert np.abs(answer.probability - expected)[free].max() < 0.015
    assert np.abs(answer.none - none)[free].max() < 0.015


def test_probabilities_sum_to_one(few):
    answer = rank(question(few, [30, 100, 140, 226], known={0: 0}))
    np.testing.assert_allclose(answer.probability.sum(axis=1) + answer.none, 1.0, atol=1e-9)
    np.testing.assert_allclose(few.by_phase(answer.row_probability), answer.probability, atol=1e-12)


@pytest.mark.parametrize(("factor", "shift"), [(0.01, -3.0), (257.0, 1000.0)])
def test_unit_of_grey_does_not_matter(few, factor, shift):
    greys = np.array([30.0, 100.0, 140.0, 226.0])
    departure = smooth_departure(few.axis.upper, lambda s: 0.03 * s, 1.0)
    here = rank(question(few, greys, se=0.5, known={0: 0}, departure=departure))
    there = rank(
        question(few, factor * greys + shift, se=0.5 * factor, known={0: 0}, departure=departure)
    )
    np.testing.assert_allclose(here.probability, there.probability, atol=1e-6)


def test_order_of_phases_does_not_matter(few):
    greys = [30, 100, 140, 226]
    here = rank(question(few, greys, known={0: 0, 3: 5}), effective=10000.0)
    turned = candidate_set(few.signal[::-1])
    there = rank(question(turned, greys, known={0: 5, 3: 0}), effective=10000.0)
    assert np.abs(here.probability - there.probability[:, ::-1]).max() < 0.01


def test_one_grey_alone_says_nothing(few):
    prior = np.array([1.0, 2, 3, 4, 5, 6])
    answer = rank(question(few, [120.0], prior=prior), effective=10000.0)
    np.testing.assert_allclose(answer.probability[0], 0.95 * prior / 21, atol=0.03)


def test_dark_level_and_one_known_phase_fix_the_scale(few):
    greys = [60.0, 110.0, 170.0, 290.0]
    ask = question(few, greys, known={3: 5})
    ask = type(ask)(**{**ask.__dict__, "anchors": [*ask.anchors, dark_level(10.0)]})
    answer = rank(ask)
    gain, gain_sd = answer.particles.mean_sd(answer.particles.gain)
    assert gain == pytest.approx(1000, rel=0.02)
    assert gain_sd < 0.03 * gain
    assert answer.probability[2].argmax() == 3
    assert answer.probability[0].argmax() == 0


def test_gap_of_three_widths_is_none_of_these():
    candidates = candidate_set([0.05, 0.10, 0.30])
    answer = rank(question(candidates, [50, 100, 180, 300], known={0: 0, 1: 1, 3: 2}))
    assert answer.none[2] > 0.95


def test_clipped_cluster_is_a_bound(few):
    ask = question(few, [60.0, 110.0, 170.0, 255.0], known={0: 0, 2: 3})
    seen = [*ask.observations[:3], Observation(255.0, 0.3, clipped="high")]
    answer = rank(type(ask)(**{**ask.__dict__, "observations": seen}))
    # Known: 0.05 at 60 and 0.16 at 170, so 255 means a signal above 0.245: only the brightest phase,
    # or something unknown.
    assert answer.probability[3, :4].sum() < 0.01
    assert answer.probability[3, 5] > 0.8


def test_small_feature_is_judged_by_what_it_hides(few):
    # A feature of signal 0.05 giving half of its signal, in a matrix of 0.28, looks like 0.165.
    ask = question(few, [60.0, 175.0, 290.0], known={0: 0, 2: 5})
    bulk = rank(ask)
    seen = list(ask.observations)
    seen[1] = Observation(175.0, 0.3, blend=Blend(matrix=2, fraction=0.5, fraction_sd=0.03))
    small = rank(type(ask)(**{**ask.__dict__, "observations": seen}))
    assert bulk.probability[1].argmax() == 3
    assert small.probability[1].argmax() == 0


def test_elements_multiply(few):
    evidence = np.ones((3, 6))
    evidence[1, 1] = 0.0
    answer = rank(question(few, [60.0, 102.0, 290.0], known={0: 0, 2: 5}, evidence=evidence))
    assert answer.probability[1, 1] == 0.0
    assert answer.probability[1].argmax() == 2


def test_evidence_that_leaves_nothing_gives_none(few):
    evidence = np.ones((3, 6))
    evidence[1] = 0.0
    answer = rank(question(few, [60.0, 102.0, 290.0], known={0: 0, 2: 5}, evidence=evidence))
    assert answer.none[1] == pytest.approx(1.0)


def test_departure_widens_far_from_a_known_phase_only():
    candidates = candidate_set(np.linspace(0.05, 0.35, 61), relative_sd=0.004)
    departure = smooth_departure(candidates.axis.upper, lambda s: 0.05 * s, 0.6)
    greys = 10 + 1000 * np.array([0.1, 0.105, 0.30])
    ask = question(candidates, greys, known={0: 10}, departure=departure)
    ask = type(ask)(**{**ask.__dict__, "anchors": [*ask.anchors, dark_level(10.0)]})
    answer = rank(ask)

    def spread(k):
        p = answer.probability[k] / answer.probability[k].sum()
        mean = p @ candidates.signal
        return np.sqrt(p @ (candidates.signal - mean) ** 2) / mean

    assert spread(2) > 2.5 * spread(1)


def test_same_seed_same_answer(few):
    ask = question(few, [30, 100, 140, 226], departure=no_departure(few))
    first, second = rank(ask, seed=4), rank(ask, seed=4)
    np.testing.assert_array_equal(first.probability, second.probability)
