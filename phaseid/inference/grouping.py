"""Candidates that a grey level cannot tell apart, shown as one group instead of a false order."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from phaseid.inference.ranking import Ranking

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]


@dataclass(frozen=True)
class Placing:
    """Where the candidates of one cluster lie on the grey axis.

    Attributes
    ----------
    phases : ndarray of shape (n,)
        Phase indices, descending probability.
    predicted_grey, predicted_sd : ndarray of shape (n,)
        Predicted grey of each and its standard deviation: scale, model and composition range.
    group : ndarray of shape (n,)
        Group numbers from 1, in the order of the groups' probabilities.
    resolution : float
        Difference of grey below which this cluster cannot tell two candidates apart.
    """

    phases: Ints
    predicted_grey: Floats
    predicted_sd: Floats
    group: Ints
    resolution: float


def predicted_greys(ranking: Ranking, phases: Ints, most: int = 1500) -> tuple[Floats, Floats]:
    """Predict the grey of given phases under the posterior of the scale.

    Parameters
    ----------
    ranking : Ranking
    phases : ndarray of int, shape (n,)
    most : int
        Number of particles used.

    Returns
    -------
    mean, sd : ndarray of shape (n,)
        The sd holds the scale's uncertainty, the smooth and the own model error and the spread of the
        phase's composition range.
    """
    particles, question = ranking.particles, ranking.question
    candidates = question.candidates
    picked = np.argsort(-particles.weight, kind="stable")[:most]
    weight = particles.weight[picked] / particles.weight[picked].sum()
    chosen = replace(
        particles,
        offset=particles.offset[picked],
        gain=particles.gain[picked],
        curves=particles.curves[picked],
        signal=particles.signal[picked],
        weight=weight,
    )
    gain = chosen.centre(chosen.gain)[0]
    means, sds = np.empty(len(phases)), np.empty(len(phases))
    for n, p in enumerate(phases):
        true = np.full(len(picked), candidates.mean_signal[p])
        grey = chosen.offset + chosen.gain * question.departure.undo(chosen.curves, true)
        means[n], spread = chosen.centre(grey)
        sds[n] = np.hypot(spread, gain * candidates.range_sd[p])
    return means, sds


def place(ranking: Ranking, cluster: int, top: int, also: Sequence[int] = ()) -> Placing:
    """Place the `top` most probable candidates of a cluster and group the inseparable ones.

    Two candidates are one group when their expected signals, given this cluster, differ by less than
    the cluster can resolve: the root sum of squares of its own standard error and of both phases' own
    prediction errors. Errors shared by neighbours on the signal axis cancel and do not count.

    Parameters
    ----------
    ranking : Ranking
    cluster : int
    top : int
    also : sequence of int
        Phases to place whatever their probability.

    Returns
    -------
    Placing
    """
    question = ranking.question
    candidates = question.candidates
    probability = ranking.probability[cluster]
    best = _best(probability, top)
    more = [p for p in dict.fromkeys(also) if p not in best]
    phases = np.concatenate([best, np.array(more, dtype=np.intp)])
    gain = ranking.particles.centre(ranking.particles.gain)[0]
    signal = _conditional_signal(ranking, cluster, phases)
    own = np.sqrt(candidates.by_phase(candidates.share * candidates.own_sd**2))[phases]
    error = question.observations[cluster].grey_se / gain
    raw = _sweep(signal, own, error)
    weight = np.bincount(raw, probability[phases])
    order = np.argsort(-weight, kind="stable")
    number = np.empty(len(order), dtype=np.intp)
    number[order] = np.arange(1, len(order) + 1)
    mean, sd = predicted_greys(ranking, phases)
    typical = float(np.median(own)) if len(own) else 0.0
    resolution = gain * float(np.hypot(np.sqrt(2) * typical, error))
    return Placing(phases, mean, sd, number[raw], resolution)


def _best(probability: Floats, top: int) -> Ints:
    """Indices of the largest probabilities; equal ones keep the order of the databases."""
    return np.argsort(-probability, kind="stable")[: min(top, len(probability))]


def _conditional_signal(ranking: Ranking, cluster: int, phases: Ints) -> Floats:
    """Expected signal of each phase given that it is this cluster (the composition that fits)."""
    candidates = ranking.question.candidates
    rows = ranking.row_probability[cluster]
    total = candidates.by_phase(rows)
    mean = candidates.by_phase(rows * candidates.signal) / np.maximum(total, 1e-300)
    return np.where(total[phases] > 0, mean[phases], candidates.mean_signal[phases])


def _sweep(signal: Floats, own_sd: Floats, error: float) -> Ints:
    """Number groups along the signal axis; a group never spans more than it can resolve."""
    group = np.zeros(len(signal), dtype=np.intp)
    order = np.argsort(signal, kind="stable")
    current, first = -1, None
    for i in order:
        apart = first is None or signal[i] - signal[first] > np.sqrt(
            own_sd[i] ** 2 + own_sd[first] ** 2 + error**2
        )
        if apart:
            current, first = current + 1, i
        group[i] = current
    return group
