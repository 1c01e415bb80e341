"""Make the example image: an invented shaft of aluminium-killed steel, sectioned at a crack.

Nothing here was measured. The greys follow from published formulas; on purpose not from the formula that
phaseid takes by default, and with a little scatter of each phase, as in nature. The truth is written
beside the image. Run: python examples/make_scene.py
"""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import tifffile

from phaseid.image.scenes import Scene, record, with_blur
from phaseid.physics.conditions import Conditions
from phaseid.physics.elements import from_atoms
from phaseid.physics.signals import signal_under

SHAPE = (512, 640)
PIXEL_NM = 250.0
CONDITIONS = Conditions(energy_keV=20.0, model="pouchou-pichoir-1991")
OFFSET, WHITE = 12.0, 205.0
SEED = 20260

# Invented: what was put in, with the formula its grey is computed from.
PHASES = {
    "Ferrite": {"Fe": 0.985, "Mn": 0.010, "Si": 0.005},
    "Manganese sulphide": {"Mn": 1.0, "S": 1.0},
    "Corundum": {"Al": 2.0, "O": 3.0},
    "Grossite": {"Ca": 1.0, "Al": 4.0, "O": 7.0},
    "Titanium nitride": {"Ti": 1.0, "N": 1.0},
}


def main() -> None:
    rng = np.random.default_rng(SEED)
    folder = Path(__file__).parent / "shaft"
    signals = signal_under(np.stack([from_atoms(a) for a in PHASES.values()]), CONDITIONS)
    signals = signals * (1 + 0.005 * rng.standard_normal(len(signals)))
    gain = (WHITE - OFFSET) / signals[0]
    greys = OFFSET + gain * signals
    truth = _layout(rng)
    crack = truth == 0
    clean = np.concatenate([[OFFSET + 4.0], greys])[truth]
    # Grains of the matrix differ a little by orientation.
    grain = rng.normal(0.0, 1.2, 40)[_cells(rng, 40)]
    clean = clean + np.where(truth == 1, grain, 0.0)
    clean[crack] += rng.normal(0.0, 5.0, int(crack.sum()))
    scene = Scene(clean.astype(np.float32), truth, np.zeros(SHAPE, np.int32), tuple(greys))
    image = record(with_blur(scene, 0.8), rng, noise=2.2, noise_slope=0.06)
    per_centimetre = 1e7 / PIXEL_NM
    tifffile.imwrite(
        folder / "scene.tif",
        image,
        compression="zlib",
        description="Invented scene of phaseid; nothing was measured.",
        metadata=None,
        resolution=(per_centimetre, per_centimetre),
        resolutionunit="CENTIMETER",
    )
    described = {
        "invented": True,
        "scenario": "A shaft of aluminium-killed steel broke in service; section through the origin "
        "of the crack. Invented, and so is every number.",
        "energy_keV": CONDITIONS.energy_keV,
        "pixel_size_nm": PIXEL_NM,
        "eta_model": CONDITIONS.model,
        "offset": OFFSET,
        "gain": round(float(gain), 3),
        "phases": [
            {"phase": name, "grey": round(float(g), 2), "area_fraction": round(float(a), 5)}
            for name, g, a in zip(
                PHASES,
                greys,
                [(truth == i + 1).mean() for i in range(len(PHASES))],
                strict=True,
            )
        ],
        "crack_area_fraction": round(float(crack.mean()), 5),
    }
    (folder / "truth.json").write_text(json.dumps(described, indent=2) + "\n", encoding="utf-8")


def _layout(rng: np.random.Generator) -> np.ndarray:
    """Which phase each pixel is; 0 is the crack."""
    truth = np.ones(SHAPE, dtype=np.uint8)
    for _ in range(16):
        _ellipse(truth, rng, 2, (rng.uniform(28, 60), rng.uniform(5, 9)), rng.normal(0.1, 0.08))
    centre = rng.uniform(0.3, 0.7, 2) * SHAPE
    for _ in range(26):
        size = rng.uniform(5, 14)
        at = centre + rng.normal(0, 45, 2)
        _ellipse(truth, rng, 3, (size, 0.8 * size), rng.uniform(0, 3), at)
    for _ in range(5):
        at = rng.uniform(0.1, 0.9, 2) * SHAPE
        _ellipse(truth, rng, 4, (rng.uniform(18, 26),) * 2, 0.0, at)
        _ellipse(truth, rng, 3, (8.0, 7.0), 0.4, at + rng.uniform(-6, 6, 2))
    for _ in range(10):
        row, column = (rng.uniform(0.05, 0.95, 2) * SHAPE).astype(int)
        side = int(rng.uniform(9, 18))
        truth[row : row + side, column : column + side] = 5
    path = 0.62 * SHAPE[0] + np.cumsum(rng.normal(0, 0.8, SHAPE[1]))
    width = np.clip(3 + np.cumsum(rng.normal(0, 0.15, SHAPE[1])), 1.5, 6)
    rows = np.arange(SHAPE[0])[:, None]
    truth[np.abs(rows - path[None, :]) < width[None, :]] = 0
    return truth


def _ellipse(
    truth: np.ndarray,
    rng: np.random.Generator,
    phase: int,
    half_axes: tuple[float, float],
    angle: float,
    at: np.ndarray | None = None,
) -> None:
    row, column = rng.uniform(0.03, 0.97, 2) * SHAPE if at is None else at
    y, x = np.mgrid[: SHAPE[0], : SHAPE[1]]
    y, x = y - row, x - column
    along, across = x * np.cos(angle) + y * np.sin(angle), y * np.cos(angle) - x * np.sin(angle)
    truth[(along / half_axes[0]) ** 2 + (across / half_axes[1]) ** 2 < 1] = phase


def _cells(rng: np.random.Generator, count: int) -> np.ndarray:
    seeds = rng.uniform(0, 1, (count, 2)) * SHAPE
    y, x = np.mgrid[: SHAPE[0], : SHAPE[1]]
    distance = (y[..., None] - seeds[:, 0]) ** 2 + (x[..., None] - seeds[:, 1]) ** 2
    return distance.argmin(axis=-1)


if __name__ == "__main__":
    main()
