"""How well clusters are found on scenes whose truth is known, beside a plain script's figures.

Run from the root of the repository::

    python -m tests.benchmarks.cluster_truth [--seeds N] [--only buried,rare,...]

The plain script (`baseline_clusters`) is told the true number of phases, except where a column says
"chosen", which is the number it picks by Schwarz's criterion.
"""

from __future__ import annotations

import argparse
import sys
from collections.abc import Callable

import numpy as np

from phaseid.image.clustering import Clustering, cluster_image
from phaseid.image.reading import from_array
from tests.benchmarks import baseline_clusters as plain
from tests.benchmarks import cluster_scenes as scenes
from tests.benchmarks.cluster_scenes import Case


def ours(case: Case) -> Clustering:
    """Cluster a case."""
    return cluster_image(from_array(case.image))


def means_of(clustering: Clustering) -> np.ndarray:  # type: ignore[type-arg]
    """Greys of the clusters."""
    return np.array([c.grey_mean for c in clustering.clusters])


def row(*cells: object) -> None:
    """Print one line of a table."""
    print("| " + " | ".join(str(c) for c in cells) + " |", flush=True)


def head(title: str, *cells: str) -> None:
    """Print the head of a table."""
    print(f"\n### {title}\n")
    row(*cells)
    row(*("---" for _ in cells))


def finite(values: list[float]) -> str:
    """Median and worst of errors that may be infinite."""
    return f"{np.median(values):.3f} / {np.max(values):.3f}"


def buried(seeds: int) -> None:
    """Point 1."""
    head(
        "Buried phases (3 phases): ours, mixture, multi-Otsu",
        "grain px",
        "step / noise",
        "number right: ours",
        "chosen by Schwarz",
        "means, median/worst error / noise: ours",
        "mixture",
        "multi-Otsu",
        "right pixels: ours",
        "mixture",
        "multi-Otsu",
    )
    for grain in (20, 40):
        for step in (0.5, 1.0, 2.0):
            number, chosen = 0, 0
            error: list[list[float]] = [[], [], []]
            right: list[list[float]] = [[], [], []]
            for seed in range(seeds):
                case = scenes.buried(grain, step, seed)
                found = ours(case)
                number += len(found.clusters) == 3
                chosen += plain.chosen_number(case.image) == 3
                rivals = (plain.mixture(case.image, 3), plain.otsu(case.image, 3))
                for n, (means, labels) in enumerate(
                    [
                        (means_of(found), found.labels),
                        *((r.means, r.labels) for r in rivals),
                    ]
                ):
                    error[n].append(scenes.largest_error(means, case))
                    right[n].append(scenes.right_pixels(labels, case))
            row(
                grain,
                step,
                f"{number}/{seeds}",
                f"{chosen}/{seeds}",
                *(finite(e) for e in error),
                *(f"{100 * np.mean(r):.2f} %" for r in right),
            )


def rare(seeds: int) -> None:
    """Point 2."""
    head(
        "Rare phases: 0.02 % in specks of 8 to 20 px",
        "scene",
        "found: ours",
        "mixture (true number)",
        "scenes with an invented phase: ours",
        "median error of its grey / noise: ours",
    )
    for name, make in (
        ("any grey, two phases", scenes.rare),
        ("4 noises, one phase", scenes.rare_faint),
    ):
        found, base, invented = 0, 0, 0
        errors = []
        for seed in range(seeds):
            case = make(seed)
            mine, wanted = ours(case), case.scene.greys[-1]
            near = [abs(c.grey_mean - wanted) for c in mine.clusters]
            others = case.scene.greys[:-1]
            limit = 0.5 * min(abs(wanted - g) for g in others)
            hit = min(near) < limit
            found += hit
            invented += len(mine.clusters) > len(others) + hit
            if hit:
                errors.append(min(near) / scenes.NOISE)
            rival = plain.mixture(case.image, len(case.scene.greys))
            base += bool(np.min(np.abs(rival.means - wanted)) < limit)
        error = f"{np.median(errors):.2f}" if errors else "-"
        row(name, f"{found}/{seeds}", f"{base}/{seeds}", f"{invented}/{seeds}", error)
    invented, chosen = 0, 0
    for seed in range(seeds):
        case = scenes.without_rare(seed)
        invented += len(ours(case).clusters) > 2
        chosen += plain.chosen_number(case.image) > 2
    row(
        "no specks",
        "-",
        "-",
        f"{invented}/{seeds} (Schwarz on the plain script: {chosen}/{seeds})",
        "-",
    )


def nothing(seeds: int) -> None:
    """Point 3."""
    head(
        "Nothing invented: one phase",
        "disturbance",
        "one phase: ours",
        "plain script by Schwarz",
        "cause named",
    )
    for kind, code in scenes.DISTURBANCES.items():
        right, base, named = 0, 0, 0
        for seed in range(seeds):
            case = scenes.one_phase(kind, seed)
            found = ours(case)
            right += len(found.phases) == 1
            base += plain.chosen_number(case.image) == 1
            named += code is None or code in {w.code for w in found.warnings}
        row(kind, f"{right}/{seeds}", f"{base}/{seeds}", f"{named}/{seeds}" if code else "-")


def blends(seeds: int) -> None:
    """Point 4."""
    head("Blends", "scene", "true phases", "number right: ours", "plain script by Schwarz")
    for kind, true in (("edges", 2), ("layers", 2), ("real middle", 3)):
        right, base = 0, 0
        for seed in range(seeds):
            case = scenes.blend(kind, seed)
            right += len(ours(case).clusters) == true
            base += plain.chosen_number(case.image) == true
        row(kind, true, f"{right}/{seeds}", f"{base}/{seeds}")


def shading(seeds: int) -> None:
    """Point 5."""
    head(
        "Shading and drift (3 phases, 4 and 6 noises apart)",
        "disturbance",
        "number right: ours",
        "right pixels: ours",
        "mixture (true number)",
        "cause named",
    )
    codes = {
        "shading": "shading",
        "shading, large grains": "shading",
        "drift": "shading",
        "line noise": "line-noise",
        "charging bands": "charging-bands",
    }
    for kind, code in codes.items():
        number, named = 0, 0
        right: list[float] = []
        base: list[float] = []
        for seed in range(seeds):
            case = scenes.shaded(kind, seed)
            found = ours(case)
            number += len(found.clusters) == 3
            named += code in {w.code for w in found.warnings}
            right.append(scenes.right_pixels(found.labels, case))
            base.append(scenes.right_pixels(plain.mixture(case.image, 3).labels, case))
        row(
            kind,
            f"{number}/{seeds}",
            f"{100 * np.mean(right):.2f} %",
            f"{100 * np.mean(base):.2f} %",
            f"{named}/{seeds}",
        )


PARTS: dict[str, Callable[[int], None]] = {
    "buried": buried,
    "rare": rare,
    "nothing": nothing,
    "blends": blends,
    "shading": shading,
}


def main(arguments: list[str]) -> None:
    """Print the tables."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--seeds", type=int, default=5)
    parser.add_argument("--only", default=",".join(PARTS))
    chosen = parser.parse_args(arguments)
    for name in chosen.only.split(","):
        PARTS[name](chosen.seeds)


if __name__ == "__main__":
    main(sys.argv[1:])
