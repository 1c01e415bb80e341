"""Do the probabilities mean what they say? Run: python -m tests.benchmarks.calibration [scenes]

Scenes are drawn anew with seeds that nothing was tuned on. Printed: a reliability table over all
candidates given one per cent or more, the expected calibration error over these and over the leaders, the log
score and the recall beside what an oracle gets that knows offset, gain and departure exactly.
"""

from __future__ import annotations

import itertools
import sys
from collections.abc import Callable, Sequence

import numpy as np

from phaseid.hooks.host import make_host
from phaseid.session.knowledge import Knowledge

from .truth import CONTEXTS, KNOWN, Outcome, World, cluster_scene, image_scene, world

EDGES = (0.01, 0.02, 0.05, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 1.0 + 1e-9)
SEED = 711
Scene = Callable[[np.random.Generator, World, str, str, int], list[Outcome]]


def collect(here: World, scene: Scene, scenes: int, seed: int = SEED) -> dict[str, list[Outcome]]:
    """Outcomes by how much was known of the scale; contexts and knowledge take turns."""
    found: dict[str, list[Outcome]] = {name: [] for name in KNOWN}
    names = list(KNOWN)
    contexts = [*CONTEXTS, ""]
    for n in range(scenes):
        rng = np.random.default_rng([seed, n])
        context, knowing = contexts[n % len(contexts)], names[n % len(names)]
        found[knowing] += scene(rng, here, context, knowing, n)
    return found


def reliability(outcomes: Sequence[Outcome]) -> list[tuple[float, float, int]]:
    """Mean probability, share that is right and number of candidates, by bin of probability."""
    given = np.concatenate([o.probability for o in outcomes])
    right = np.concatenate([np.arange(len(o.probability)) == o.truth for o in outcomes])
    rows = []
    for low, high in itertools.pairwise(EDGES):
        inside = (given >= low) & (given < high)
        if inside.any():
            rows.append(
                (float(given[inside].mean()), float(right[inside].mean()), int(inside.sum()))
            )
    return rows


def calibration_error(outcomes: Sequence[Outcome]) -> float:
    """Expected calibration error over all candidates given one per cent or more (Naeini et al. 2015)."""
    rows = reliability(outcomes)
    total = sum(n for _, _, n in rows)
    return sum(n * abs(p - r) for p, r, n in rows) / total


def leader_error(outcomes: Sequence[Outcome], bins: int = 10) -> float:
    """The same over each cluster's most probable candidate."""
    best = np.array([o.probability.max() for o in outcomes])
    right = np.array([o.probability.argmax() == o.truth for o in outcomes])
    where = np.minimum((best * bins).astype(int), bins - 1)
    return float(
        sum(
            (where == b).mean() * abs(best[where == b].mean() - right[where == b].mean())
            for b in np.unique(where)
        )
    )


def log_score(outcomes: Sequence[Outcome], of: str = "probability") -> float:
    """Mean log2 of the probability given to the truth."""
    return float(np.mean([np.log2(max(getattr(o, of)[o.truth], 1e-9)) for o in outcomes]))


def recall(outcomes: Sequence[Outcome], top: int, of: str = "probability") -> float:
    """Share of clusters whose truth is among the first `top`."""
    return float(
        np.mean([np.sum(getattr(o, of) > getattr(o, of)[o.truth]) < top for o in outcomes])
    )


def report(title: str, found: dict[str, list[Outcome]]) -> None:
    everything = [o for part in found.values() for o in part]
    print(f"\n{title}: {len(everything)} clusters")
    print(f"{'known of the scale':32}{'n':>6}{'ECE':>8}{'leader':>8}{'log2':>8}{'oracle':>8}"
          f"{'top1':>7}{'oracle':>8}{'top3':>7}{'oracle':>8}")  # fmt: skip
    for name, part in (*found.items(), ("all", everything)):
        if part:
            print(
                f"{name:32}{len(part):6d}{calibration_error(part):8.4f}{leader_error(part):8.4f}"
                f"{log_score(part):8.2f}{log_score(part, 'oracle'):8.2f}"
                f"{recall(part, 1):7.3f}{recall(part, 1, 'oracle'):8.3f}"
                f"{recall(part, 3):7.3f}{recall(part, 3, 'oracle'):8.3f}"
            )
    print("given   right   candidates")
    for given, right, number in reliability(everything):
        print(f"{given:.3f}   {right:.3f}   {number}")


def main() -> None:
    scenes = int(sys.argv[1]) if len(sys.argv) > 1 else 200
    knowledge = Knowledge.load(host=make_host(entry_points=False, folders=[]))
    for kind, words in (("own", "(a) truth from the tool's own model"),
                        ("published", "(b) truth's eta formula and compound rule drawn among the published")):  # fmt: skip
        here = world(knowledge, kind)
        report(f"{words}; clusters", collect(here, cluster_scene, scenes))
        report(f"{words}; images", collect(here, image_scene, scenes // 2, SEED + 1))


if __name__ == "__main__":
    main()
