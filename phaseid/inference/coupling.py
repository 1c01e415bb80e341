"""What the identity of one cluster says about the others: coexistence and distinctness.

Given the grey scale the clusters are independent; coexistence rules and "two clusters are not the same
phase" are not. For every particle the identities of all clusters are drawn from what the particle
allows, and the draw is weighted by the product of the pairwise factors: exact up to sampling noise,
whatever the number of rules.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from phaseid.inference.candidates import CandidateSet
from phaseid.inference.scale import Particles, ScaleProblem

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]

# Rows that carry less of a cluster than this cannot change the answer visibly.
_NEGLIGIBLE = 1e-4


@dataclass(frozen=True)
class Coupling:
    """Factors between the identities of two clusters of one image or series.

    Attributes
    ----------
    pairs : mapping of (int, int) to float
        For phase indices (p < q), the factor on two clusters being p and q; 1 where absent.
    same : ndarray of shape (P,)
        Factor on two clusters both being phase p: near zero for a fixed composition, one for a solid
        solution, which can well appear at two greys.
    """

    pairs: dict[tuple[int, int], float]
    same: Floats


def couple(
    coupling: Coupling,
    problem: ScaleProblem,
    particles: Particles,
    set_of: Callable[[int], CandidateSet],
    weights: Floats,
    rows: Floats,
    none: Floats,
    known: dict[int, int],
    seed: int,
) -> tuple[Particles, Floats, Floats]:
    """Weigh joint identities by the coupling.

    Parameters
    ----------
    coupling : Coupling
    problem : ScaleProblem
    particles : Particles
    set_of : callable
        The candidates as a given cluster shows them, P phases in R rows.
    weights : ndarray of shape (K, R)
        Prior weight of each row for each cluster, evidence included.
    rows : ndarray of shape (K, R)
        Probability of each row before the coupling; rows that carry nothing are not drawn.
    none : ndarray of shape (K,)
        Prior weight of "none of these" for each cluster, evidence included.
    known : mapping of int to int
        Clusters whose phase is given.
    seed : int

    Returns
    -------
    particles : Particles
        The same particles with their weights changed by the coupling.
    term : ndarray of shape (K, P)
        Factor of each phase's probability due to the coupling.
    none_term : ndarray of shape (K,)
        The same for "none of these".
    """
    generator = np.random.default_rng(seed + 1)
    chosen = _resample(particles, 1 << 12, generator)
    identity = np.stack(
        [
            np.full(len(chosen), known[k])
            if k in known
            else _draw_identities(
                problem, particles, set_of(k), weights[k], rows[k], none[k], k, chosen, generator
            )
            for k in range(len(weights))
        ],
        axis=1,
    )
    factor = _joint_factor(coupling, identity)
    clusters, phases = len(weights), set_of(0).size
    term = np.ones((clusters, phases))
    none_term = np.ones(clusters)
    mean = max(float(factor.mean()), 1e-12)
    for k in range(clusters):
        drawn = identity[:, k] + 1
        counts = np.bincount(drawn, minlength=phases + 1)
        sums = np.bincount(drawn, factor, phases + 1)
        # One pseudo-draw at the mean keeps phases that were hardly drawn where they were.
        ratio = (sums / mean + 1.0) / (counts + 1.0)
        none_term[k], term[k] = ratio[0], ratio[1:]
    share = np.bincount(chosen, factor, len(particles.weight))
    touched = np.bincount(chosen, minlength=len(particles.weight))
    multiplier = (share / mean + 1.0) / (touched + 1.0)
    weight = particles.weight * multiplier
    moved = Particles(
        particles.offset,
        particles.gain,
        particles.curves,
        particles.signal,
        weight / weight.sum(),
        particles.log_evidence + float(np.log(mean)),
    )
    return moved, term, none_term


def _resample(particles: Particles, count: int, generator: np.random.Generator) -> Ints:
    """Draw particle indices in proportion to their weights (systematic resampling, Kitagawa 1996)."""
    positions = (generator.random() + np.arange(count)) / count
    edges = np.cumsum(particles.weight)
    return np.minimum(np.searchsorted(edges, positions), len(edges) - 1)


def _draw_identities(
    problem: ScaleProblem,
    particles: Particles,
    candidates: CandidateSet,
    weights: Floats,
    probability: Floats,
    none: float,
    k: int,
    chosen: Ints,
    generator: np.random.Generator,
) -> Ints:
    """Draw a phase for cluster k from each chosen particle; -1 stands for none of these."""
    axis, clipped = problem.axis, problem.observations[k].clipped
    below, share, _ = axis.locate(particles.signal[chosen, k])
    node = below + (generator.random(len(chosen)) < share)
    rows = np.flatnonzero(probability > _NEGLIGIBLE * probability.max(initial=0.0))
    identity = np.full(len(chosen), -1, dtype=np.intp)
    order = np.argsort(node, kind="stable")
    bounds = np.flatnonzero(np.diff(node[order], prepend=-1))
    table = candidates.kernels if clipped is None else candidates.cumulative
    for start, stop in zip(bounds, [*bounds[1:], len(order)], strict=True):
        members = order[start:stop]
        here = int(node[members[0]])
        column = table[rows, here].astype(float)
        if clipped == "high":
            column = 1.0 - column
        edges = np.cumsum(weights[rows] * column)
        if not len(edges):
            continue
        # What is left above the rows is "none of these".
        share = axis.nodes[here] / axis.nodes[-1]
        beside = {None: 1.0 / axis.nodes[-1], "low": share, "high": 1.0 - share}[clipped]
        total = edges[-1] + none * beside
        picked = np.searchsorted(edges, generator.random(len(members)) * max(total, 1e-300))
        found = picked < len(rows)
        identity[members[found]] = candidates.phase[rows[picked[found]]]
    return identity


def _joint_factor(coupling: Coupling, identity: Ints) -> Floats:
    """Product of the pairwise factors of each draw."""
    factor = np.ones(len(identity))
    phases = len(coupling.same)
    keys = np.array([p * phases + q for p, q in coupling.pairs], dtype=np.int64)
    values = np.array(list(coupling.pairs.values()), dtype=float)
    order = np.argsort(keys)
    keys, values = keys[order], values[order]
    clusters = identity.shape[1]
    for a in range(clusters):
        for b in range(a + 1, clusters):
            low = np.minimum(identity[:, a], identity[:, b])
            high = np.maximum(identity[:, a], identity[:, b])
            real = low >= 0
            same = real & (low == high)
            factor[same] *= coupling.same[low[same]]
            if len(keys):
                key = low * phases + high
                at = np.minimum(np.searchsorted(keys, key), len(keys) - 1)
                hit = real & (keys[at] == key)
                factor[hit] *= values[at[hit]]
    return factor
