"""Is the advice worth following? Run: python -m tests.benchmarks.advice_truth [scenes]

On simulated scenes an analyst asks whether an element is in the X-ray spectrum of a cluster, gets the true
answer as an X-ray spectrum would give it, and asks again. Printed: what is left of the candidate lists, in
bits per cluster, after each question, when the question is the tool's first advice, the most frequent
element not yet asked, or iron first; for the fixed rules, on the cluster that is least settled.
"""

from __future__ import annotations

import sys
from collections.abc import Callable
from dataclasses import replace

import numpy as np

from phaseid.hooks.host import make_host
from phaseid.inference.advice import AdviceContext, advise, entropy_bits
from phaseid.inference.coupling import Coupling
from phaseid.inference.evidence import elements_evidence, none_likelihood, visibility
from phaseid.inference.observations import Anchor, Observation, dark_level
from phaseid.inference.ranking import Question, Ranking, rank
from phaseid.phases.catalogue import merge
from phaseid.phases.kept import load_kept
from phaseid.physics.elements import SYMBOLS
from phaseid.session.knowledge import Knowledge

from .truth import NONE, Nature, World, draw_nature, world

ROUNDS = 4
SEED = 4242
FILES = (
    "silicates-framework",
    "silicates-other",
    "carbonates-evaporites",
    "accessory-oxides",
    "ore-sulphides",
)
CONTEXTS = (
    "rock/igneous/granite",
    "rock/metamorphic/skarn",
    "rock/ore/porphyry",
    "rock/sedimentary/limestone",
)
Asked = dict[int, set[str]]
Rule = Callable[[Ranking, Asked, np.ndarray], tuple[int, str] | None]


def left(ranking: Ranking) -> np.ndarray:
    """Entropy of each cluster's list, in bits."""
    return np.array(
        [
            entropy_bits(np.append(p, n))
            for p, n in zip(ranking.probability, ranking.none, strict=True)
        ]
    )


def by_advice(ranking: Ranking, asked: Asked, visible: np.ndarray) -> tuple[int, str] | None:
    labels = [str(k) for k in range(len(ranking.probability))]
    known = frozenset(ranking.question.known)
    measures = advise(ranking, AdviceContext(visible, labels, asked, known=known))
    return next(((m.cluster, m.detail) for m in measures if m.kind == "element"), None)


def by_frequency(order: list[str]) -> Rule:
    def rule(ranking: Ranking, asked: Asked, visible: np.ndarray) -> tuple[int, str] | None:
        bits = left(ranking)
        bits[list(ranking.question.known)] = -1.0
        k = int(bits.argmax())
        return next(((k, s) for s in order if s not in asked.get(k, set())), None)

    return rule


def scene(
    rng: np.random.Generator, here: World, context: str
) -> tuple[Question, Nature, np.ndarray]:
    """A scene with one known phase and the dark level."""
    count = int(rng.integers(3, 6))
    nature = draw_nature(rng, here, context, count)
    greys = nature.offset + nature.gain * nature.apparent + 0.3 * rng.standard_normal(count)
    order = np.argsort(greys)
    greys, truth = greys[order], nature.phases[order]
    candidates = here.candidates
    named = {int(k): int(truth[k]) for k in np.flatnonzero(truth >= 0)[-1:]}
    anchors = [
        Anchor(greys[k], 0.3, *candidates.rows_of(p), label="known", observation=k)
        for k, p in named.items()
    ]
    anchors.append(dark_level(nature.offset, 0.3))
    size = len(candidates.set.signal)
    question = Question(
        candidates.set,
        candidates.departure,
        [Observation(float(g), 0.3) for g in greys],
        here.weights[context],
        np.ones((count, size)),
        np.ones(count),
        anchors,
        named,
        coupling=Coupling({}, np.where(candidates.variable, 1.0, 0.01)),
    )
    return question, nature, truth


def follow(
    rng: np.random.Generator,
    question: Question,
    truth: np.ndarray,
    rule: Rule,
    visible: np.ndarray,
    seed: int,
) -> tuple[list[float], list[float]]:
    """Bits left per cluster, and the truth's probability, after each question."""
    candidates = question.candidates
    evidence, none = question.evidence.copy(), question.none_evidence.copy()
    asked: Asked = {}
    free = [k for k in range(len(truth)) if k not in question.known]
    bits, sure = [], []
    answers = rng.random((len(truth), len(SYMBOLS)))
    for turn in range(ROUNDS + 1):
        ranking = rank(replace(question, evidence=evidence, none_evidence=none), seed)
        bits.append(float(left(ranking)[free].mean()))
        sure.append(
            float(
                np.mean(
                    [
                        ranking.none[k] if truth[k] == NONE else ranking.probability[k, truth[k]]
                        for k in free
                    ]
                )
            )
        )
        choice = rule(ranking, asked, visible) if turn < ROUNDS else None
        if choice is None:
            bits += [bits[-1]] * (ROUNDS + 1 - len(bits))
            sure += [sure[-1]] * (ROUNDS + 1 - len(sure))
            break
        k, symbol = choice
        z = SYMBOLS.index(symbol)
        rows = np.flatnonzero(candidates.phase == truth[k])
        # What the databases do not hold shows what a random phase shows.
        chance = (
            visible[:, z].mean() if truth[k] == NONE else candidates.share[rows] @ visible[rows, z]
        )
        shows = answers[k, z] < chance
        likelihood = elements_evidence(
            visible, [symbol] if shows else [], [] if shows else [symbol]
        )
        evidence[k] *= likelihood
        none[k] *= none_likelihood(candidates, likelihood)
        asked.setdefault(k, set()).add(symbol)
    return bits, sure


def compare(scenes: int, here: World, seed: int = SEED) -> dict[str, tuple[np.ndarray, np.ndarray]]:
    """Mean bits left and mean probability of the truth after each question, by rule."""
    visible = visibility(here.candidates.set)
    share = here.candidates.set.by_phase((here.candidates.set.share[:, None] * visible).T).mean(
        axis=1
    )
    frequent = [SYMBOLS[z] for z in np.argsort(-share)]
    rules: dict[str, Rule] = {
        "first advice": by_advice,
        "most frequent element": by_frequency(frequent),
        "iron first": by_frequency(["Fe", *frequent]),
    }
    found: dict[str, list[tuple[list[float], list[float]]]] = {name: [] for name in rules}
    for n in range(scenes):
        rng = np.random.default_rng([seed, n])
        question, _, truth = scene(rng, here, CONTEXTS[n % len(CONTEXTS)])
        if len(question.known) == len(truth):
            continue
        for name, rule in rules.items():
            found[name].append(
                follow(np.random.default_rng([seed, n, 1]), question, truth, rule, visible, n)
            )
    return {
        name: (np.mean([b for b, _ in runs], axis=0), np.mean([s for _, s in runs], axis=0))
        for name, runs in found.items()
    }


def small_world() -> World:
    """Five mineral files: enough to choose among, and quick to rank."""
    host = make_host(entry_points=False, folders=[])
    files = [p for p in host.databases() if p.stem in FILES]
    return world(Knowledge(host, merge([load_kept(p) for p in files])), "own", CONTEXTS)


def main() -> None:
    scenes = int(sys.argv[1]) if len(sys.argv) > 1 else 200
    print(
        f"{scenes} scenes; bits left per cluster (probability of the truth) after 0, 1, 2 ... questions"
    )
    for name, (bits, sure) in compare(scenes, small_world()).items():
        cells = "  ".join(f"{b:5.2f} ({s:.3f})" for b, s in zip(bits, sure, strict=True))
        print(f"{name:24}{cells}")


if __name__ == "__main__":
    main()
