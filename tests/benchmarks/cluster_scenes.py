"""Scenes for the measured promises about clusters, and how answers are scored."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from phaseid.image import scenes
from phaseid.image.scenes import Scene

NOISE = 4.0
SHAPE = (768, 768)


@dataclass(frozen=True, eq=False)
class Case:
    """An image with the truth it was made from."""

    image: NDArray[Any]
    scene: Scene


def buried(grain_px: float, step: float, seed: int, phases: int = 3) -> Case:
    """Phases `step` noise standard deviations apart, blurred borders."""
    rng = np.random.default_rng(seed)
    greys = [100 + NOISE * step * k for k in range(phases)]
    scene = scenes.with_blur(scenes.grains(SHAPE, greys, grain_px, rng), 1.0)
    return Case(scenes.record(scene, rng, noise=NOISE), scene)


def rare(seed: int) -> Case:
    """0.02 % of the area in specks of 8 to 20 pixels, four noises or more from both phases."""
    rng = np.random.default_rng(seed)
    greys = (90.0, 130.0)
    allowed = [g for g in range(20, 221) if min(abs(g - p) for p in greys) >= 4 * NOISE]
    scene = scenes.grains((1024, 1024), greys, 60, rng)
    scene = scenes.with_specks(scene, float(rng.choice(allowed)), rng)
    scene = scenes.with_blur(scene, 1.0)
    return Case(scenes.record(scene, rng, noise=NOISE), scene)


def rare_faint(seed: int) -> Case:
    """The same at a contrast of exactly four noises, in one phase."""
    rng = np.random.default_rng(seed)
    scene = scenes.grains((1024, 1024), [120.0], 60, rng)
    scene = scenes.with_specks(scene, 120.0 + rng.choice([-1.0, 1.0]) * 4 * NOISE, rng)
    scene = scenes.with_blur(scene, 1.0)
    return Case(scenes.record(scene, rng, noise=NOISE), scene)


def without_rare(seed: int) -> Case:
    """The two phases of `rare` without any specks."""
    rng = np.random.default_rng(seed)
    scene = scenes.with_blur(scenes.grains((1024, 1024), [90.0, 130.0], 60, rng), 1.0)
    return Case(scenes.record(scene, rng, noise=NOISE), scene)


def one_phase(kind: str, seed: int) -> Case:
    """One phase with one disturbance."""
    rng = np.random.default_rng(seed)
    channelling = {"channelling": 4.0, "channelling, large grains": 4.0}.get(kind, 0.0)
    grain_px = 150 if kind.endswith("large grains") else 60
    scene = scenes.grains(SHAPE, [120.0], grain_px, rng, channelling=channelling)
    changes: dict[str, Callable[[Scene], Scene]] = {
        "shading": lambda s: scenes.with_shading(s, 20.0, rng),
        "gradient": lambda s: scenes.with_drift(s, 15.0),
        "scratch": lambda s: scenes.with_lines(s, 200.0, rng, number=2, straight=True),
        "cracks": lambda s: scenes.with_lines(s, 20.0, rng),
        "pores": lambda s: scenes.with_pores(s, rng),
        "line noise": lambda s: scenes.with_line_noise(s, 2.0, rng),
        "charging bands": lambda s: scenes.with_bands(s, 12.0, rng),
    }
    scene = scenes.with_blur(changes.get(kind, lambda s: s)(scene), 1.0)
    image = scenes.record(scene, rng, noise=NOISE)
    if kind == "JPEG blocks":
        image = scenes.jpeg(image)
    if kind == "comb":
        image = scenes.comb(image, 60.0, 180.0)
    return Case(image, scene)


DISTURBANCES: dict[str, str | None] = {
    "noise": None,
    "shading": "shading",
    "gradient": "shading",
    "channelling": "channelling",
    "channelling, large grains": "channelling",
    "scratch": "scratches",
    "cracks": "cracks",
    "pores": "pores",
    "JPEG blocks": "lossy-blocks",
    "comb": "comb-histogram",
    "line noise": "line-noise",
    "charging bands": "charging-bands",
}


def blend(kind: str, seed: int) -> Case:
    """A dark and a bright phase with blurred borders, thin layers, or a real phase between them."""
    rng = np.random.default_rng(seed)
    if kind == "real middle":
        shares = [0.45, 0.1, 0.45]
        scene = scenes.grains(SHAPE, [60.0, 120.0, 180.0], 40, rng, shares=shares)
    elif kind == "layers":
        scene = scenes.grains(SHAPE, [60.0, 180.0], 120, rng)
        scene = scenes.with_lines(scene, 120.0, rng, number=12, width_px=2.0)
    else:
        scene = scenes.grains(SHAPE, [60.0, 180.0], 40, rng)
    scene = scenes.with_blur(scene, 1.5)
    return Case(scenes.record(scene, rng, noise=NOISE), scene)


def shaded(kind: str, seed: int) -> Case:
    """Three phases under shading, drift, line noise or bands."""
    rng = np.random.default_rng(seed)
    grain_px = 300 if kind == "shading, large grains" else 40
    scene = scenes.grains(SHAPE, [100.0, 116.0, 140.0], grain_px, rng)
    scene = scenes.with_blur(scene, 1.0)
    if kind.startswith("shading"):
        scene = scenes.with_shading(scene, 20.0, rng)
    elif kind == "drift":
        scene = scenes.with_drift(scene, 20.0)
    elif kind == "line noise":
        scene = scenes.with_line_noise(scene, 3.0, rng)
    elif kind == "charging bands":
        scene = scenes.with_bands(scene, 12.0, rng)
    return Case(scenes.record(scene, rng, noise=NOISE), scene)


def right_pixels(labels: NDArray[Any], case: Case) -> float:
    """Share of the pixels with the right label, clusters and phases both taken in grey order."""
    order = np.argsort(case.scene.greys)
    rank = np.zeros(len(order) + 1, dtype=int)
    rank[order + 1] = np.arange(1, len(order) + 1)
    truth = rank[case.scene.truth]
    seen = truth > 0
    return float(np.mean(labels[seen] == truth[seen]))


def largest_error(means: NDArray[Any], case: Case) -> float:
    """Largest error of a mean, in noise standard deviations; infinite if the number is wrong."""
    greys = np.sort(case.scene.greys)
    if len(means) != len(greys):
        return float("inf")
    return float(np.abs(np.sort(means) - greys).max() / NOISE)
