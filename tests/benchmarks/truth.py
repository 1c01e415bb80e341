"""Scenes whose truth is known, at the level of clusters and of images, for checking probabilities."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from phaseid.image.clustering import cluster_image
from phaseid.image.reading import from_array
from phaseid.image.scenes import grains, record, with_blur
from phaseid.inference.coupling import Coupling
from phaseid.inference.observations import Anchor, Observation, dark_level
from phaseid.inference.ranking import Question, Ranking, rank
from phaseid.physics.conditions import Conditions
from phaseid.physics.signals import signal_ensemble
from phaseid.session.candidates import GRAIN_SD, Candidates
from phaseid.session.knowledge import Knowledge
from phaseid.session.state import State

CONTEXTS = (
    "rock/igneous/granite", "rock/igneous/basalt", "rock/metamorphic/skarn", "cement/clinker",
    "cement/hydrated", "ceramic/alumina", "slag/steelmaking", "rock/sedimentary/limestone",
    "coating/thermal-barrier", "rock/meteorite/chondrite",
)  # fmt: skip
NONE = -1
# How much is known of the scale: number of known phases, whether the dark level is given, and whether
# six standards across the axis were imaged at the same settings.
KNOWN = {
    "nothing": (0, False, False),
    "1 known phase": (1, False, False),
    "2 known phases": (2, False, False),
    "1 known phase and dark level": (1, True, False),
    "six standards and dark level": (0, True, True),
}


@dataclass(frozen=True)
class World:
    """The candidates and how nature departs from the tool's prediction of them.

    `kind` is "own" where nature follows the tool's stated error model, "published" where it follows one of
    the published formulas and compound rules, drawn for each scene.
    """

    candidates: Candidates
    weights: dict[str, np.ndarray]
    ensemble: np.ndarray
    kind: str


def world(knowledge: Knowledge, kind: str, contexts: Sequence[str] = CONTEXTS) -> World:
    """Set a world up at 20 keV."""
    conditions = Conditions(energy_keV=20.0)
    candidates = knowledge.candidates(conditions)
    weights = {
        c: knowledge.prior(State(contexts=(c,) if c else ()), candidates) for c in (*contexts, "")
    }
    rows = candidates.set.mass_fractions.astype(float)
    ensemble, _ = signal_ensemble(rows, 20.0)
    hole = rows.sum(axis=1) == 0
    ensemble[:, hole] = candidates.set.signal[hole]
    return World(candidates, weights, ensemble, kind)


@dataclass(frozen=True)
class Nature:
    """What is true in one scene."""

    phases: np.ndarray
    apparent: np.ndarray
    offset: float
    gain: float
    row_signal: np.ndarray
    curve: np.ndarray | None


def draw_nature(rng: np.random.Generator, here: World, context: str, count: int) -> Nature:
    """Draw the phases of a scene from the prior, their signals, and the scale of the image."""
    candidates = here.candidates.set
    prior = here.weights[context] / here.weights[context].sum()
    phases: list[int] = []
    while len(phases) < count:
        phase = NONE if rng.random() < 0.05 else int(rng.choice(candidates.size, p=prior))
        if phase == NONE or phase not in phases:
            phases.append(phase)
    row_signal = candidates.signal
    curve = None
    if here.kind == "published":
        row_signal = here.ensemble[rng.integers(len(here.ensemble))]
    true = np.empty(count)
    for i, phase in enumerate(phases):
        if phase == NONE:
            true[i] = rng.uniform(0, candidates.axis.nodes[-1])
            continue
        rows = np.flatnonzero(candidates.phase == phase)
        row = rng.choice(rows, p=candidates.share[rows] / candidates.share[rows].sum())
        own = candidates.own_sd[row] if here.kind == "own" else GRAIN_SD * row_signal[row]
        true[i] = abs(row_signal[row] + own * rng.standard_normal())
    if here.kind == "own":
        departure = here.candidates.departure
        curve = departure.curves(rng.standard_normal((1, departure.terms)))
        true = np.array([departure.undo(curve, np.array([t]))[0] for t in true])
    low, high = true.min(), true.max()
    gain = rng.uniform(90, 200) / (high - low)
    offset = rng.uniform(15, 45) - gain * low
    return Nature(np.array(phases), true, float(offset), float(gain), row_signal, curve)


@dataclass(frozen=True)
class Outcome:
    """One cluster: probabilities (the last is "none of these"), its truth, and the oracle's."""

    probability: np.ndarray
    truth: int
    oracle: np.ndarray


def ask(
    rng: np.random.Generator,
    here: World,
    nature: Nature,
    greys: np.ndarray,
    errors: np.ndarray,
    truth: np.ndarray,
    context: str,
    knowing: str,
    seed: int,
) -> tuple[Ranking, list[int]]:
    """Rank the clusters of a scene with the given knowledge of the scale."""
    candidates = here.candidates
    phases, dark, standards = KNOWN[knowing]
    order = [k for k in rng.permutation(len(greys)) if truth[k] >= 0]
    named = {int(k): int(truth[k]) for k in order[: min(phases, len(greys) - 1)]}
    anchors = [
        Anchor(greys[k], errors[k], *candidates.rows_of(p), label="known", observation=k)
        for k, p in named.items()
    ]
    if dark:
        anchors.append(dark_level(nature.offset, 0.3))
    if standards:
        anchors += _standards(rng, here, nature)
    size = len(candidates.set.signal)
    question = Question(
        candidates.set,
        candidates.departure,
        [Observation(float(g), float(e)) for g, e in zip(greys, errors, strict=True)],
        here.weights[context],
        np.ones((len(greys), size)),
        np.ones(len(greys)),
        anchors,
        named,
        coupling=Coupling({}, np.where(candidates.variable, 1.0, 0.01)),
    )
    return rank(question, seed=seed), [k for k in range(len(greys)) if k not in named]


def _standards(rng: np.random.Generator, here: World, nature: Nature) -> list[Anchor]:
    """Pure, exactly known materials spread over the axis."""
    candidates = here.candidates.set
    wanted = np.quantile(candidates.signal, [0.03, 0.2, 0.4, 0.6, 0.8, 0.97])
    rows = [int(np.argmin(np.abs(candidates.signal - w))) for w in wanted]
    anchors = []
    for row in rows:
        true = np.array([nature.row_signal[row]])
        if nature.curve is not None:
            true = here.candidates.departure.undo(nature.curve, true)
        own = 0.003 * true[0]
        grey = nature.offset + nature.gain * (true[0] + own * rng.standard_normal())
        one = np.ones(1)
        anchors.append(
            Anchor(float(grey), 0.2, candidates.signal[row] * one, own * one, one, "standard")
        )
    return anchors


def oracle(here: World, nature: Nature, grey: float, error: float, context: str) -> np.ndarray:
    """What is known of a cluster when scale, formula and departure are known exactly."""
    candidates = here.candidates.set
    prior = here.weights[context] / here.weights[context].sum()
    signal = np.array([(grey - nature.offset) / nature.gain])
    if nature.curve is not None:
        signal = signal + here.candidates.departure.at(nature.curve, signal)[0]
    own = candidates.own_sd if here.kind == "own" else GRAIN_SD * nature.row_signal
    sd = np.hypot(own, error / nature.gain) + 1e-6
    density = np.exp(-0.5 * ((signal[0] - nature.row_signal) / sd) ** 2) / (sd * np.sqrt(2 * np.pi))
    by_phase = candidates.by_phase(0.95 * prior[candidates.phase] * candidates.share * density)
    none = 0.05 / candidates.axis.nodes[-1]
    return np.append(by_phase, none) / (by_phase.sum() + none)


def cluster_scene(
    rng: np.random.Generator, here: World, context: str, knowing: str, seed: int
) -> list[Outcome]:
    """A scene that starts at clusters: greys with an honest error, no pixels."""
    count = int(rng.integers(3, 7))
    nature = draw_nature(rng, here, context, count)
    errors = rng.uniform(0.05, 0.8, count)
    greys = nature.offset + nature.gain * nature.apparent + errors * rng.standard_normal(count)
    order = np.argsort(greys)
    return _outcomes(
        rng, here, nature, greys[order], errors[order], nature.phases[order], context, knowing, seed
    )


def image_scene(
    rng: np.random.Generator, here: World, context: str, knowing: str, seed: int
) -> list[Outcome]:
    """A scene of pixels: grains, blur, noise; clustered by the tool, truth by the majority of pixels."""
    count = int(rng.integers(3, 6))
    nature = draw_nature(rng, here, context, count)
    greys = nature.offset + nature.gain * nature.apparent
    noise = rng.uniform(2.0, 6.0)
    scene = with_blur(
        grains((224, 224), list(greys), rng.uniform(18, 40), rng), rng.uniform(0.4, 1.0)
    )
    clustering = cluster_image(from_array(record(scene, rng, noise=noise)))
    kept, truth = [], []
    for cluster in clustering.clusters:
        inside = scene.truth[clustering.labels == cluster.id]
        shares = np.bincount(inside[inside > 0], minlength=count + 1)
        if cluster.clipped is None:
            kept.append(cluster)
            truth.append(int(nature.phases[int(shares.argmax()) - 1]))
    if not kept:
        return []
    measured = np.array([c.grey_mean for c in kept])
    errors = np.array([max(c.grey_se, 1e-3) for c in kept])
    return _outcomes(rng, here, nature, measured, errors, np.array(truth), context, knowing, seed)


def _outcomes(
    rng: np.random.Generator,
    here: World,
    nature: Nature,
    greys: np.ndarray,
    errors: np.ndarray,
    truth: np.ndarray,
    context: str,
    knowing: str,
    seed: int,
) -> list[Outcome]:
    answer, asked = ask(rng, here, nature, greys, errors, truth, context, knowing, seed)
    none = here.candidates.set.size
    return [
        Outcome(
            np.append(answer.probability[k], answer.none[k]),
            none if truth[k] == NONE else int(truth[k]),
            oracle(here, nature, greys[k], errors[k], context),
        )
        for k in asked
    ]
