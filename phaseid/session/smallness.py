"""Features smaller than the signal volume: what they show, and at which beam energy they could be judged."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from phaseid.inference.candidates import CandidateSet
from phaseid.inference.ranking import Ranking
from phaseid.physics.depth import highest_energy_keV
from phaseid.physics.features import feature_fraction, feature_signal, feature_signal_sd
from phaseid.session.answers import Notice
from phaseid.session.candidates import VOID_SIGNALS, Candidates

# With more than this of its signal its own, a feature counts as bulk.
BULK = 0.97
# With less, its grey says next to nothing.
HOPELESS = 0.25


@dataclass(frozen=True)
class Feature:
    """A family of clusters: its typical diameter and the family around it."""

    observation: int
    matrix: int
    diameter_um: float


def small_features(
    ranking: Ranking, candidates: Candidates, features: Sequence[Feature]
) -> tuple[dict[int, CandidateSet], list[Notice]]:
    """Work out what small features show in place of their bulk signals.

    Parameters
    ----------
    ranking : Ranking
        A first ranking that takes everything for bulk; it tells the signal of the matrix.
    candidates : Candidates
    features : sequence of Feature

    Returns
    -------
    dict of int to CandidateSet
        For the observations that are too small to be bulk.
    list of Notice
    """
    found: dict[int, CandidateSet] = {}
    notices: list[Notice] = []
    for feature in features:
        seen = ranking.question.observations[feature.observation]
        if feature.observation == feature.matrix or not np.isfinite(feature.diameter_um):
            continue
        if seen.clipped is not None or feature.observation in ranking.question.known:
            continue
        made, share = _seen_as(ranking, candidates, feature)
        if share > BULK:
            continue
        found[feature.observation] = made
        notices.append(_notice(candidates, feature, seen.grey_mean, share))
    return found, notices


def _seen_as(
    ranking: Ranking, candidates: Candidates, feature: Feature
) -> tuple[CandidateSet, float]:
    rows = candidates.set
    particles = ranking.particles
    matrix_signal = float(particles.weight @ particles.signal[:, feature.matrix])
    matrix_range = _range_of(ranking, candidates, feature.matrix)
    ranges = np.array([s.range_um for s in candidates.shown])[rows.phase]
    # A density nobody knows is taken as the matrix's; it only sets how fast the signal fades in.
    ranges = np.where(np.isfinite(ranges), ranges, matrix_range)
    size = (feature.diameter_um, ranges, matrix_range)
    signal = feature_signal(rows.signal, matrix_signal, *size)
    share = feature_fraction(*size)
    spread = feature_signal_sd(rows.signal, matrix_signal, *size)
    own = np.hypot(share * rows.own_sd, spread)
    # Holes are not blends of material: what comes out of them is in their signals already.
    holes = slice(len(rows.signal) - len(VOID_SIGNALS), None)
    signal[holes], own[holes] = rows.signal[holes], rows.own_sd[holes]
    weight = ranking.row_probability[feature.observation]
    typical = float(weight @ share / max(weight.sum(), 1e-12))
    return rows.seen_as(signal, own), typical


def _range_of(ranking: Ranking, candidates: Candidates, observation: int) -> float:
    """Electron range in what a cluster probably is, um."""
    ranges = np.array([s.range_um for s in candidates.shown])
    known = np.isfinite(ranges)
    weight = ranking.probability[observation][known] + 1e-12
    return float(weight @ ranges[known] / weight.sum())


def _notice(candidates: Candidates, feature: Feature, grey: float, share: float) -> Notice:
    ranges = np.array([s.range_um for s in candidates.shown])
    typical = float(np.nanmedian(ranges))
    at_20 = typical * (20.0 / candidates.conditions.energy_keV) ** 1.67
    best = float(highest_energy_keV(feature.diameter_um, at_20))
    said = (
        "its grey says next to nothing of what it is"
        if share < HOPELESS
        else "the ranking takes this into account, and is broader for it"
    )
    remedy = (
        f"At {best:.0f} keV or less they could be judged."
        if best >= 2
        else "They are too small to be judged by grey at any usual beam energy."
    )
    return Notice(
        "small-features",
        f"The features at grey {grey:.4g} are {feature.diameter_um:.2g} um wide: about {share:.0%} of "
        f"their signal is their own, the rest comes from around them; {said}.",
        remedy,
    )
