"""Probabilities of the candidates of every cluster, averaged over the grey scale's posterior."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from phaseid.inference.candidates import CandidateSet
from phaseid.inference.coupling import Coupling, couple
from phaseid.inference.departure import Departure
from phaseid.inference.observations import Anchor, Observation
from phaseid.inference.scale import Particles, ScaleProblem

Floats = NDArray[np.float64]

# Share of clusters that are nothing in the databases; common practice, the user can change it.
NONE_WEIGHT = 0.05


@dataclass(frozen=True)
class Question:
    """Everything the ranking depends on.

    Attributes
    ----------
    candidates : CandidateSet
        P phases in R rows.
    departure : Departure
        The smooth part of the model's error.
    observations : sequence of Observation
        K clusters.
    prior : ndarray of shape (P,)
        Weight of each phase from the context; any scale.
    evidence : ndarray of shape (K, R)
        Likelihood of the evidence about each cluster (elements, size, user's word) under each row.
    none_evidence : ndarray of shape (K,)
        The same under "none of these".
    anchors : sequence of Anchor
        Known phases, standards, the dark level.
    known : mapping of int to int
        Cluster index to phase index, for the clusters the user has named.
    none_weight : float
        Prior probability of "none of these".
    drift : tuple of float
        See `ScaleProblem`.
    coupling : Coupling or None
        What the identity of one cluster says about another.
    small : mapping of int to CandidateSet
        Clusters whose features are too small to show bulk signals, and the signals they show instead.
    """

    candidates: CandidateSet
    departure: Departure
    observations: Sequence[Observation]
    prior: Floats
    evidence: Floats
    none_evidence: Floats
    anchors: Sequence[Anchor] = ()
    known: dict[int, int] = field(default_factory=dict)
    none_weight: float = NONE_WEIGHT
    drift: tuple[float, float] = (0.0, 0.0)
    coupling: Coupling | None = None
    small: Mapping[int, CandidateSet] = field(default_factory=dict)

    def set_of(self, k: int) -> CandidateSet:
        """The candidates as cluster k shows them."""
        return self.small.get(k, self.candidates)


@dataclass(frozen=True)
class Ranking:
    """The answer.

    Attributes
    ----------
    probability : ndarray of shape (K, P)
        Probability that a cluster is a phase.
    none : ndarray of shape (K,)
        Probability of "none of these"; ``probability.sum(1) + none == 1``.
    row_probability : ndarray of shape (K, R)
        The same for each composition variant.
    grey_term : ndarray of shape (K, P)
        Factor by which grey and scale alone changed each phase's probability.
    coupling_term : ndarray of shape (K, P)
        Factor by which the other clusters' identities changed it.
    particles : Particles
        The grey scale's posterior.
    question : Question
    """

    probability: Floats
    none: Floats
    row_probability: Floats
    grey_term: Floats
    coupling_term: Floats
    particles: Particles
    question: Question


def rank(question: Question, seed: int = 0, effective: float = 1200.0) -> Ranking:
    """Rank all phases for all clusters.

    Parameters
    ----------
    question : Question
    seed : int
        The same seed gives the same answer.
    effective : float
        Effective number of particles wanted; see `ScaleProblem.sample`.

    Returns
    -------
    Ranking

    Notes
    -----
    For a cluster with mean grey m and a phase p with weight w and evidence e,

        P(p | all) = E over scale [ w e N(m | scale, p) / sum over phases of the same ].

    Phases enter only through their place on the signal axis, so the sum is a tabulated density and the
    expectation is a deposit of the particles on the same nodes: both are one matrix product.
    """
    candidates = question.candidates
    weights = _row_weights(question)
    none_density = np.full(len(candidates.axis), 1.0 / candidates.axis.nodes[-1])
    none = question.none_weight * question.none_evidence
    densities = weights.astype(np.float32) @ candidates.kernels
    for k, seen_as in question.small.items():
        densities[k] = weights[k].astype(np.float32) @ seen_as.kernels
    densities = densities.astype(float) + none[:, None] * none_density
    problem = ScaleProblem(
        candidates.axis,
        question.departure,
        question.observations,
        densities,
        question.anchors,
        question.drift,
    )
    particles = problem.sample(seed, effective)
    deposits = np.stack(
        [_deposit(problem, particles, k) for k in range(len(question.observations))]
    )
    grey_rows = _grey_factor(question, deposits)
    grey_none = _none_factor(question, deposits)
    none_prior = none
    rows, none = _normalised(weights * grey_rows, none * grey_none)
    coupling_term = np.ones((len(rows), candidates.size))
    probability = candidates.by_phase(rows)
    if question.coupling is not None and len(rows) > 1:
        particles, coupling_term, none_term = couple(
            question.coupling,
            problem,
            particles,
            question.set_of,
            weights,
            rows,
            none_prior,
            question.known,
            seed,
        )
        rows, none = _normalised(rows * coupling_term[:, candidates.phase], none * none_term)
        probability = candidates.by_phase(rows)
    for k, p in question.known.items():
        inside = candidates.phase == p
        rows[k] = np.where(inside, candidates.share, 0.0)
        none[k] = 0.0
        probability[k] = 0.0
        probability[k, p] = 1.0
    before = candidates.by_phase(weights)
    grey_term = candidates.by_phase(weights * grey_rows) / np.maximum(before, 1e-300)
    return Ranking(probability, none, rows, grey_term, coupling_term, particles, question)


def _row_weights(question: Question) -> Floats:
    """Prior weight of every row for every cluster, evidence included, shape (K, R)."""
    candidates = question.candidates
    prior = question.prior / question.prior.sum() * (1.0 - question.none_weight)
    weights: Floats = (prior[candidates.phase] * candidates.share)[None, :] * question.evidence
    return weights


def _deposit(problem: ScaleProblem, particles: Particles, k: int) -> Floats:
    """Spread the particles' weights over the nodes, each divided by the cluster's total density there."""
    below, share, inside = problem.axis.locate(particles.signal[:, k])
    clipped = problem.observations[k].clipped
    row = problem.densities[k]
    if clipped is not None:
        row = _cumulative(problem, row, clipped)
    here = row[below] + share * (row[below + 1] - row[below])
    scaled = np.where(inside, particles.weight / np.maximum(here, 1e-12), 0.0)
    count = len(problem.axis)
    deposit = np.bincount(below, scaled * (1 - share), count)
    return np.asarray(deposit + np.bincount(below + 1, scaled * share, count), dtype=float)


def _cumulative(problem: ScaleProblem, density: Floats, clipped: str) -> Floats:
    """Mass on the lost side of each node."""
    steps = np.diff(problem.axis.nodes)
    under: Floats = np.concatenate([[0.0], np.cumsum((density[1:] + density[:-1]) / 2 * steps)])
    return under if clipped == "low" else np.asarray(under[-1] - under)


def _grey_factor(question: Question, deposits: Floats) -> Floats:
    """For each cluster and row, the posterior mean of its density over the cluster's total density."""
    candidates = question.candidates
    factor = deposits.astype(np.float32) @ candidates.kernels.T
    for k, seen in enumerate(question.observations):
        if k in question.small:
            factor[k] = question.set_of(k).kernels @ deposits[k].astype(np.float32)
        if seen.clipped is not None:
            under = question.set_of(k).cumulative
            side = under if seen.clipped == "low" else 1.0 - under
            factor[k] = side @ deposits[k].astype(np.float32)
    return np.asarray(factor, dtype=float)


def _none_factor(question: Question, deposits: Floats) -> Floats:
    axis = question.candidates.axis
    flat = np.full(len(axis), 1.0 / axis.nodes[-1])
    share_below = axis.nodes / axis.nodes[-1]
    factors = []
    for k, seen in enumerate(question.observations):
        side = {None: flat, "low": share_below, "high": 1.0 - share_below}[seen.clipped]
        factors.append(deposits[k] @ side)
    return np.array(factors)


def _normalised(rows: Floats, none: Floats) -> tuple[Floats, Floats]:
    """Scale each cluster's probabilities to sum to one; evidence that leaves nothing gives "none"."""
    total = rows.sum(axis=1) + none
    empty = total <= 0
    scaled = rows / np.where(empty, 1.0, total)[:, None]
    return scaled, np.where(empty, 1.0, none / np.where(empty, 1.0, total))
