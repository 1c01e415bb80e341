"""What to measure next: the expected information, in bits, of every feasible measurement.

Expected information is the mutual information between the measurement's outcome and the identity of
the cluster (Lindley 1956): by how many bits the candidate list is expected to shrink.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from phaseid.inference.ranking import Ranking
from phaseid.physics.elements import SYMBOLS

Floats = NDArray[np.float64]

# Effort of each kind of measurement relative to one X-ray point; common practice, changeable.
COSTS: Mapping[str, float] = {
    "element": 1.0,
    "spectrum": 1.0,
    "standard": 2.0,
    "energy": 2.0,
    "frames": 1.5,
    "diffraction": 6.0,
}
# How well a standard of similar signal fixes the signal of a cluster, relative; common practice.
STANDARD_SD = 0.015
# Share of a phase's own prediction error that another beam energy does not repeat; common practice.
ENERGY_INDEPENDENT = 0.5
# Probability that a diffraction pattern is indexed and the phase found; common practice.
INDEXING = 0.9
# Gains below this are not worth a sentence.
LEAST_BITS = 0.02


@dataclass(frozen=True)
class Measure:
    """One feasible measurement on one cluster.

    Attributes
    ----------
    cluster : int
        Index of the cluster.
    kind : {"spectrum", "element", "standard", "energy", "frames", "diffraction"}
    detail : str
        Element symbol, beam energy in keV, or empty.
    bits : float
        Expected information.
    cost : float
        Effort in units of one X-ray point.
    text : str
        The sentence an analyst would say.
    """

    cluster: int
    kind: str
    detail: str
    bits: float
    cost: float
    text: str

    @property
    def worth(self) -> float:
        """Bits per unit of effort."""
        return self.bits / self.cost


@dataclass(frozen=True)
class AdviceContext:
    """What the advice needs beside the ranking.

    Attributes
    ----------
    visible : ndarray of shape (R, 103)
        Probability that each element is reported in a spectrum of each row.
    asked : mapping of int to set of str
        Elements already answered, per cluster index.
    other_energies : mapping of float to ndarray of shape (P,)
        Predicted signals at other beam energies, keV.
    structures : sequence of str, optional
        Label of each phase that a diffraction pattern reveals.
    labels : sequence of str
        How each cluster is called in sentences.
    known : set of int
        Clusters that are settled.
    costs : mapping of str to float
    """

    visible: Floats
    labels: Sequence[str]
    asked: Mapping[int, set[str]] = field(default_factory=dict)
    other_energies: Mapping[float, Floats] = field(default_factory=dict)
    structures: Sequence[str] = ()
    known: frozenset[int] = frozenset()
    costs: Mapping[str, float] = field(default_factory=lambda: COSTS)


def advise(ranking: Ranking, context: AdviceContext, most: int = 3) -> list[Measure]:
    """List the measurements worth making, best first.

    Parameters
    ----------
    ranking : Ranking
    context : AdviceContext
    most : int
        Largest number of X-ray elements proposed per cluster.

    Returns
    -------
    list of Measure
        In descending order of bits per unit of effort.
    """
    measures: list[Measure] = []
    for k in range(len(ranking.probability)):
        if k in context.known:
            continue
        measures += _elements(ranking, context, k, most)
        measures += _others(ranking, context, k)
    worth = [m for m in measures if m.bits >= LEAST_BITS]
    return sorted(worth, key=lambda m: (-m.worth, m.cluster, m.kind, m.detail))


def entropy_bits(probability: Floats) -> float:
    """Shannon entropy of a distribution, in bits."""
    positive = probability[probability > 0]
    return float(-(positive * np.log2(positive)).sum())


def _binary_entropy(p: Floats) -> Floats:
    p = np.clip(p, 1e-12, 1 - 1e-12)
    return np.asarray(-(p * np.log2(p) + (1 - p) * np.log2(1 - p)))


def leading_rows(rows: Floats, most: int = 2500) -> NDArray[np.intp]:
    """Rows that carry nearly all of a cluster's probability, in their own order."""
    best = np.argsort(-rows, kind="stable")[:most]
    kept = np.sort(best[rows[best] > 1e-6])
    return kept if len(kept) else best[:1]


def element_bits(ranking: Ranking, visible: Floats, k: int) -> Floats:
    """Expected information of "does the spectrum of cluster k show element X", shape (103,)."""
    rows, none = ranking.row_probability[k], float(ranking.none[k])
    candidates = ranking.question.candidates
    # Rows of one phase share their identity, so the outcome is averaged within the phase first. Rows
    # of a phase lie together, so the sums are over runs.
    active = leading_rows(rows)
    starts = np.flatnonzero(np.diff(candidates.phase[active], prepend=-1))
    weight = np.add.reduceat(rows[active], starts)
    outcome = np.add.reduceat(rows[active, None] * visible[active], starts, axis=0)
    outcome /= weight[:, None]
    none_outcome = visible.mean(axis=0)
    mixed = weight @ outcome + none * none_outcome
    inner = weight @ _binary_entropy(outcome) + none * _binary_entropy(none_outcome)
    return np.asarray(np.maximum(_binary_entropy(mixed) - inner, 0.0))


def spectrum_bits(
    ranking: Ranking, visible: Floats, k: int, left: NDArray[np.bool_], draws: int = 160
) -> float:
    """Expected information of a whole X-ray spectrum: which of all elements it shows.

    Parameters
    ----------
    ranking : Ranking
    visible : ndarray of shape (R, 103)
    k : int
    left : ndarray of bool, shape (103,)
        Elements that are not answered yet.
    draws : int
        Spectra simulated; the same ones for the same ranking.

    Returns
    -------
    float
        Bits, by simulation: spectra are drawn from what the cluster can be, and the entropy that each
        leaves is averaged.
    """
    rows, none = ranking.row_probability[k], float(ranking.none[k])
    active = leading_rows(rows, 600)
    phases, place = np.unique(ranking.question.candidates.phase[active], return_inverse=True)
    # "None of these" is an unknown phase: any phase of the databases may stand for its spectrum.
    chance = np.vstack([visible[active], visible.mean(axis=0)])[:, left]
    weight = np.append(rows[active], none)
    generator = np.random.default_rng(k)
    source = generator.choice(len(weight), size=draws, p=weight / weight.sum())
    shown = generator.random((draws, chance.shape[1])) < chance[source]
    fits = shown @ np.log(chance).T + ~shown @ np.log1p(-chance).T
    joint = weight * np.exp(fits - fits.max(axis=1, keepdims=True))
    index = np.append(place, len(phases))
    by_phase = np.zeros((draws, len(phases) + 1))
    np.add.at(by_phase.T, index, joint.T)
    by_phase /= by_phase.sum(axis=1, keepdims=True)
    after = -np.sum(by_phase * np.log2(np.maximum(by_phase, 1e-300)), axis=1).mean()
    before = entropy_bits(np.bincount(index, weight) / weight.sum())
    return max(before - float(after), 0.0)


def _elements(ranking: Ranking, context: AdviceContext, k: int, most: int) -> list[Measure]:
    bits = element_bits(ranking, context.visible, k)
    left = np.ones(len(bits), dtype=bool)
    left[[SYMBOLS.index(symbol) for symbol in context.asked.get(k, set())]] = False
    bits[~left] = 0.0
    best = np.argsort(-bits, kind="stable")[:most]
    first = ", ".join(SYMBOLS[i] for i in best if bits[i] > LEAST_BITS)
    whole = Measure(
        k,
        "spectrum",
        "",
        spectrum_bits(ranking, context.visible, k, left),
        context.costs["spectrum"],
        f"Take an X-ray spectrum of {context.labels[k]}; look for {first} first."
        if first
        else f"Take an X-ray spectrum of {context.labels[k]}.",
    )
    cost = context.costs["element"]
    return [
        whole,
        *(
            Measure(
                k,
                "element",
                SYMBOLS[i],
                float(bits[i]),
                cost,
                f"Does the X-ray spectrum of {context.labels[k]} show {SYMBOLS[i]}?",
            )
            for i in best
        ),
    ]


def _others(ranking: Ranking, context: AdviceContext, k: int) -> list[Measure]:
    label, costs = context.labels[k], context.costs
    found = [
        Measure(
            k,
            "standard",
            "",
            standard_bits(ranking, k),
            costs["standard"],
            f"Image a standard close in grey to {label} at the same settings, or a second known phase.",
        ),
        Measure(
            k,
            "frames",
            "",
            frames_bits(ranking, k),
            costs["frames"],
            f"Average more frames (or raise the contrast) so that the grey of {label} is known better.",
        ),
    ]
    for energy, signal in context.other_energies.items():
        found.append(
            Measure(
                k,
                "energy",
                f"{energy:g}",
                energy_bits(ranking, signal, k),
                costs["energy"],
                f"Image {label} and its neighbours again at {energy:g} keV with the same settings.",
            )
        )
    if context.structures:
        found.append(
            Measure(
                k,
                "diffraction",
                "",
                diffraction_bits(ranking, context.structures, k),
                costs["diffraction"],
                f"Take an electron diffraction pattern of {label}.",
            )
        )
    return found


def standard_bits(ranking: Ranking, k: int) -> float:
    """Expected information of fixing the cluster's signal to `STANDARD_SD` by a standard."""
    question, particles = ranking.question, ranking.particles
    if question.observations[k].clipped is not None:
        return 0.0
    candidates, axis = question.candidates, question.candidates.axis
    probability, none = ranking.probability[k], float(ranking.none[k])
    active = leading_rows(probability, 400)
    before = entropy_bits(np.append(probability[active], none))
    signal = np.clip(particles.signal[:, k], 1e-4, axis.nodes[-1])
    bins = np.floor(np.log(signal + 0.02) / STANDARD_SD).astype(int)
    rows = np.flatnonzero(np.isin(candidates.phase, active))
    weight = (
        question.prior[candidates.phase[rows]]
        / question.prior.sum()
        * (1 - question.none_weight)
        * candidates.share[rows]
        * question.evidence[k, rows]
    )
    position = {int(p): n for n, p in enumerate(active)}
    place = np.array([position[int(p)] for p in candidates.phase[rows]], dtype=np.intp)
    after = total = 0.0
    for value in np.unique(bins):
        members = bins == value
        mass = float(particles.weight[members].sum())
        if mass < 1e-3:
            continue
        centre = np.array([float(np.average(signal[members], weights=particles.weight[members]))])
        below, share, _ = axis.locate(centre)
        column = (1 - share[0]) * candidates.kernels[rows, below[0]] + share[
            0
        ] * candidates.kernels[rows, below[0] + 1]
        joint = np.bincount(place, weight * column, len(active))
        nothing = question.none_weight * question.none_evidence[k] / axis.nodes[-1]
        distribution = np.append(joint, nothing)
        after += mass * entropy_bits(distribution / distribution.sum())
        total += mass
    return max(before - after / max(total, 1e-12), 0.0)


def frames_bits(ranking: Ranking, k: int) -> float:
    """Expected information of halving the cluster's grey error (Gaussian channel, Shannon 1949)."""
    question = ranking.question
    seen = question.observations[k]
    if seen.clipped is not None:
        return 0.0
    gain = ranking.particles.centre(ranking.particles.gain)[0]
    probability = ranking.probability[k]
    own = float(probability @ question.candidates.range_sd) * gain
    now, then = own**2 + seen.grey_se**2, own**2 + seen.grey_se**2 / 4
    limit = entropy_bits(np.append(probability, ranking.none[k]))
    return float(min(0.5 * np.log2(max(now, 1e-30) / max(then, 1e-30)), limit))


def energy_bits(ranking: Ranking, signal: Floats, k: int) -> float:
    """Expected information of the cluster's signal at another beam energy.

    What counts is how far the candidates part at the other energy relative to where they are now; the
    part of their own error that repeats at the other energy cancels.
    """
    question = ranking.question
    if question.observations[k].clipped is not None:
        return 0.0
    candidates, axis = question.candidates, question.candidates.axis
    probability = ranking.probability[k]
    active = leading_rows(probability, 200)
    if len(active) < 2:
        return 0.0
    weight = probability[active] / probability[active].sum()
    now = candidates.mean_signal[active]
    moved = signal[active] / np.maximum(now, 1e-6)
    # Only the change against a common factor is news: the gain at the other energy is free.
    centre = float(weight @ now)
    level = centre * moved / float(weight @ moved)
    own = np.sqrt(candidates.by_phase(candidates.share * candidates.own_sd**2))[active]
    spread = np.hypot(ENERGY_INDEPENDENT * own, 0.003 * centre)
    kernels = axis.kernels(level, spread).astype(float)
    mixed = weight @ kernels
    inner = _differential_entropy(kernels, axis.widths)
    bits = float(_differential_entropy(mixed, axis.widths)) - float(weight @ inner)
    return float(np.clip(bits, 0.0, entropy_bits(weight)) * probability[active].sum())


def _differential_entropy(density: Floats, widths: Floats) -> Floats:
    """Differential entropy in bits along the last axis."""
    positive = np.maximum(density, 1e-300)
    return np.asarray(-(density * np.log2(positive)) @ widths)


def diffraction_bits(ranking: Ranking, structures: Sequence[str], k: int) -> float:
    """Expected information of a diffraction pattern that names the structure when it is indexed."""
    probability, none = ranking.probability[k], float(ranking.none[k])
    active = np.flatnonzero(probability > 1e-5)
    groups: dict[str, float] = {}
    for p in active:
        label = structures[int(p)]
        groups[label] = groups.get(label, 0.0) + float(probability[p])
    return INDEXING * entropy_bits(np.array([*groups.values(), none]))
