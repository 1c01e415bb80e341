"""Images of invented samples whose truth is known.

A simulation for testing, for planning an acquisition and for examples; nothing here looks at a real
image. Greys are built up in the order nature does: grains and what lies in them, blur by the signal
volume, shading and drift of the instrument, noise whose variance follows the grey, rounding and clipping.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

FloatImage = NDArray[np.float32]
LabelImage = NDArray[np.uint8]


@dataclass(frozen=True, eq=False)
class Scene:
    """A scene in the making, or finished.

    Attributes
    ----------
    clean : ndarray of float32, shape (rows, columns)
        Greys without noise.
    truth : ndarray of uint8, shape (rows, columns)
        Phase of each pixel, 1 to the number of phases in the order of `greys`; 0 where there is none
        (cracks, pores, the bar).
    grains : ndarray of int32, shape (rows, columns)
        Grain of each pixel.
    greys : tuple of float
        True grey of each phase.
    notes : tuple of str
        What was done, in order.
    """

    clean: FloatImage
    truth: LabelImage
    grains: NDArray[np.int32]
    greys: tuple[float, ...]
    notes: tuple[str, ...] = field(default=())

    @property
    def shape(self) -> tuple[int, int]:
        """Rows and columns."""
        return int(self.clean.shape[0]), int(self.clean.shape[1])


def grains(
    shape: tuple[int, int],
    greys: Sequence[float],
    grain_px: float,
    rng: np.random.Generator,
    *,
    shares: Sequence[float] | None = None,
    channelling: float = 0.0,
) -> Scene:
    """Fill an image with grains: Voronoi cells of jittered grid points.

    Parameters
    ----------
    shape : (int, int)
    greys : sequence of float
        Grey of each phase.
    grain_px : float
        Side of the mean grain's square.
    rng : Generator
    shares : sequence of float, optional
        Share of the grains of each phase; equal by default.
    channelling : float
        Standard deviation of the grey from grain to grain.

    Returns
    -------
    Scene
    """
    cells = [max(1, int(np.ceil(n / grain_px))) + 4 for n in shape]
    jitter = rng.uniform(0.0, 1.0, size=(2, *cells))
    at = [
        ((np.arange(cells[0])[:, None] - 2 + jitter[0]) * grain_px).astype(np.float32),
        ((np.arange(cells[1])[None, :] - 2 + jitter[1]) * grain_px).astype(np.float32),
    ]
    owner = np.empty(shape, dtype=np.int32)
    # Strips keep the working arrays small for large images.
    for first in range(0, shape[0], 256):
        rows = np.arange(first, min(first + 256, shape[0]))
        owner[rows] = _nearest(rows, shape[1], grain_px, at, cells)
    number = cells[0] * cells[1]
    phase = rng.choice(len(greys), size=number, p=shares).astype(np.uint8)
    offset = rng.normal(0.0, channelling, size=number) if channelling else np.zeros(number)
    grey = (np.asarray(greys, dtype=float)[phase] + offset).astype(np.float32)
    return Scene(grey[owner], phase[owner] + np.uint8(1), owner, tuple(map(float, greys)))


def _nearest(
    rows: NDArray[Any], columns: int, grain_px: float, at: list[FloatImage], cells: list[int]
) -> NDArray[np.int32]:
    y = rows.astype(np.float32)[:, None]
    x = np.arange(columns, dtype=np.float32)[None, :]
    cell_y = (y // grain_px).astype(np.int32) + 2
    cell_x = (x // grain_px).astype(np.int32) + 2
    best = np.full((len(rows), columns), np.inf, dtype=np.float32)
    owner = np.zeros((len(rows), columns), dtype=np.int32)
    for dy in (-2, -1, 0, 1, 2):
        for dx in (-2, -1, 0, 1, 2):
            i = np.clip(cell_y + dy, 0, cells[0] - 1)
            j = np.clip(cell_x + dx, 0, cells[1] - 1)
            distance = (at[0][i, j] - y) ** 2 + (at[1][i, j] - x) ** 2
            closer = distance < best
            best = np.where(closer, distance, best)
            owner = np.where(closer, i * cells[1] + j, owner)
    return owner


def with_specks(
    scene: Scene,
    grey: float,
    rng: np.random.Generator,
    *,
    area_share: float = 0.0002,
    pixels: tuple[int, int] = (8, 20),
) -> Scene:
    """Scatter small round specks of one more phase.

    Parameters
    ----------
    scene : Scene
    grey : float
        Grey of the new phase.
    rng : Generator
    area_share : float
        Share of the image they cover together.
    pixels : (int, int)
        Smallest and largest size of one.

    Returns
    -------
    Scene
    """
    clean, truth = scene.clean.copy(), scene.truth.copy()
    wanted = area_share * clean.size
    covered = 0
    label = np.uint8(len(scene.greys) + 1)
    while covered < wanted:
        size = int(rng.integers(pixels[0], pixels[1] + 1))
        row, column = (int(rng.integers(6, n - 6)) for n in scene.shape)
        box = (slice(row - 5, row + 6), slice(column - 5, column + 6))
        y, x = np.mgrid[-5:6, -5:6]
        distance = (y - rng.uniform(-0.5, 0.5)) ** 2 + (x - rng.uniform(-0.5, 0.5)) ** 2
        inside = distance <= np.sort(distance, axis=None)[size - 1]
        if (truth[box] == label).any():
            continue
        clean[box][inside] = grey
        truth[box][inside] = label
        covered += size
    return replace(
        scene,
        clean=clean,
        truth=truth,
        greys=(*scene.greys, float(grey)),
        notes=(*scene.notes, "specks"),
    )


def with_lines(
    scene: Scene,
    grey: float,
    rng: np.random.Generator,
    *,
    number: int = 6,
    width_px: float = 1.5,
    straight: bool = False,
    phase: int = 0,
) -> Scene:
    """Draw cracks (winding), scratches (straight) or thin layers.

    Parameters
    ----------
    scene : Scene
    grey : float
    rng : Generator
    number : int
    width_px : float
    straight : bool
    phase : int
        What the truth says of them: 0 for no phase.

    Returns
    -------
    Scene
    """
    clean, truth = scene.clean.copy(), scene.truth.copy()
    rows, columns = scene.shape
    length = int(1.2 * max(rows, columns))
    reach = int(np.ceil(width_px / 2 + 1))
    for _ in range(number):
        heading = rng.uniform(0, 2 * np.pi)
        turns = np.zeros(length) if straight else np.cumsum(rng.normal(0, 0.05, length))
        y = rng.uniform(0, rows) + np.cumsum(np.sin(heading + turns))
        x = rng.uniform(0, columns) + np.cumsum(np.cos(heading + turns))
        keep = (y > -reach) & (y < rows + reach) & (x > -reach) & (x < columns + reach)
        for cy, cx in zip(y[keep], x[keep], strict=True):
            r0, r1 = max(0, int(cy) - reach), min(rows, int(cy) + reach + 2)
            c0, c1 = max(0, int(cx) - reach), min(columns, int(cx) + reach + 2)
            yy, xx = np.mgrid[r0:r1, c0:c1]
            inside = (yy - cy) ** 2 + (xx - cx) ** 2 <= (width_px / 2) ** 2
            clean[r0:r1, c0:c1][inside] = grey
            truth[r0:r1, c0:c1][inside] = phase
    return replace(
        scene, clean=clean, truth=truth, notes=(*scene.notes, "scratches" if straight else "cracks")
    )


def with_pores(
    scene: Scene,
    rng: np.random.Generator,
    *,
    grey: float = 12.0,
    rough: float = 6.0,
    number: int = 40,
    radius_px: tuple[float, float] = (4.0, 15.0),
) -> Scene:
    """Punch round pores whose dark floor is uneven.

    Parameters
    ----------
    scene : Scene
    rng : Generator
    grey, rough : float
        Grey of the floor and its unevenness (standard deviation over about four pixels).
    number : int
    radius_px : (float, float)

    Returns
    -------
    Scene
    """
    clean, truth = scene.clean.copy(), scene.truth.copy()
    relief = blurred(rng.normal(size=scene.shape).astype(np.float32), 2.0)
    floor = grey + rough * relief / float(relief.std())
    for _ in range(number):
        radius = rng.uniform(*radius_px)
        row, column = rng.uniform(0, scene.shape[0]), rng.uniform(0, scene.shape[1])
        r0, r1 = max(0, int(row - radius) - 1), min(scene.shape[0], int(row + radius) + 2)
        c0, c1 = max(0, int(column - radius) - 1), min(scene.shape[1], int(column + radius) + 2)
        y, x = np.mgrid[r0:r1, c0:c1]
        inside = (y - row) ** 2 + (x - column) ** 2 <= radius**2
        clean[r0:r1, c0:c1][inside] = floor[r0:r1, c0:c1][inside]
        truth[r0:r1, c0:c1][inside] = 0
    return replace(scene, clean=clean, truth=truth, notes=(*scene.notes, "pores"))


def with_blur(scene: Scene, sigma_px: float) -> Scene:
    """Blur by a Gaussian: beam and signal volume."""
    return replace(
        scene,
        clean=blurred(scene.clean, sigma_px),
        notes=(*scene.notes, f"blur {sigma_px:g} px"),
    )


def with_shading(scene: Scene, amplitude: float, rng: np.random.Generator) -> Scene:
    """Add a smooth surface of second order, `amplitude` greys from its lowest to its highest point."""
    y = np.linspace(-1, 1, scene.shape[0])[:, None]
    x = np.linspace(-1, 1, scene.shape[1])[None, :]
    a, b, c, d, e = rng.normal(size=5)
    surface = a * x + b * y + 0.5 * (c * x * x + d * y * y + e * x * y)
    surface = amplitude * (surface - surface.min()) / np.ptp(surface)
    clean = scene.clean + (surface - surface.mean()).astype(np.float32)
    return replace(scene, clean=clean, notes=(*scene.notes, f"shading {amplitude:g}"))


def with_drift(scene: Scene, amplitude: float) -> Scene:
    """Add a steady drift from the first row to the last."""
    ramp = np.linspace(-amplitude / 2, amplitude / 2, scene.shape[0])[:, None]
    return replace(
        scene,
        clean=(scene.clean + ramp).astype(np.float32),
        notes=(*scene.notes, f"drift {amplitude:g}"),
    )


def with_line_noise(scene: Scene, sd: float, rng: np.random.Generator) -> Scene:
    """Add one random offset per row."""
    offset = rng.normal(0.0, sd, size=(scene.shape[0], 1))
    return replace(
        scene,
        clean=(scene.clean + offset).astype(np.float32),
        notes=(*scene.notes, f"line noise {sd:g}"),
    )


def with_bands(
    scene: Scene, amplitude: float, rng: np.random.Generator, *, number: int = 4
) -> Scene:
    """Add bands of rows that charge: a jump that decays over some tens of rows."""
    offset = np.zeros(scene.shape[0])
    for start in rng.integers(0, scene.shape[0], size=number):
        length = scene.shape[0] - int(start)
        sign = rng.choice([-1.0, 1.0])
        decay = rng.uniform(0.01, 0.05) * scene.shape[0]
        offset[start:] += sign * amplitude * np.exp(-np.arange(length) / decay)
    return replace(
        scene,
        clean=(scene.clean + offset[:, None]).astype(np.float32),
        notes=(*scene.notes, f"charging bands {amplitude:g}"),
    )


def record(
    scene: Scene,
    rng: np.random.Generator,
    *,
    noise: float = 4.0,
    noise_slope: float = 0.0,
    correlation_px: float = 0.0,
    bits: int = 8,
) -> NDArray[Any]:
    """Record a scene: noise, rounding, clipping.

    Parameters
    ----------
    scene : Scene
    rng : Generator
    noise : float
        Standard deviation at grey 0.
    noise_slope : float
        Variance added per grey (shot noise).
    correlation_px : float
        The noise is blurred along the rows by this much and scaled back (a slow amplifier).
    bits : int
        8 or 16; 32 gives float32 without rounding or clipping.

    Returns
    -------
    ndarray of uint8, uint16 or float32
    """
    image = np.empty(scene.shape, np.dtype({8: np.uint8, 16: np.uint16, 32: np.float32}[bits]))
    high = 2**bits - 1 if bits < 32 else np.inf
    if correlation_px:
        raw = rng.standard_normal(scene.shape, dtype=np.float32)
        raw = _along(raw, correlation_px, 1)
        raw /= raw.std()
    for first in range(0, scene.shape[0], 256):
        part = slice(first, min(first + 256, scene.shape[0]))
        clean = scene.clean[part]
        sd = np.sqrt(np.maximum(noise**2 + noise_slope * clean, 0.0), dtype=np.float32)
        draw = raw[part] if correlation_px else rng.standard_normal(clean.shape, dtype=np.float32)
        grey = clean + sd * draw
        image[part] = grey if bits == 32 else np.clip(np.rint(grey), 0, high)
    return image


def comb(image: NDArray[np.uint8], low: float, high: float) -> NDArray[np.uint8]:
    """Stretch `low`..`high` to 0..255 after recording, which leaves gaps between the greys."""
    table = np.clip(np.rint((np.arange(256) - low) * 255.0 / (high - low)), 0, 255)
    return np.asarray(table.astype(np.uint8)[image])


def jpeg(image: NDArray[np.uint8], step: float = 24.0) -> NDArray[np.uint8]:
    """Round the cosine coefficients of blocks of 8 x 8 pixels, as lossy compression does.

    Parameters
    ----------
    image : ndarray of uint8
    step : float
        Rounding step of the highest frequency; the lowest has a quarter of it.

    Returns
    -------
    ndarray of uint8
    """
    n = np.arange(8)
    cosine = np.sqrt(2 / 8) * np.cos(np.pi * (2 * n[None, :] + 1) * n[:, None] / 16)
    cosine[0] /= np.sqrt(2)
    rows, columns = (8 * (s // 8) for s in image.shape)
    blocks = image[:rows, :columns].reshape(rows // 8, 8, columns // 8, 8).astype(float)
    frequency = n[:, None] + n[None, :]
    steps = step * (0.25 + 0.75 * frequency / 14)
    coefficient = np.einsum("ai,risj,bj->rasb", cosine, blocks, cosine)
    coefficient = np.rint(coefficient / steps[None, :, None, :]) * steps[None, :, None, :]
    back = np.einsum("ai,rasb,bj->risj", cosine, coefficient, cosine)
    result = image.copy()
    result[:rows, :columns] = np.clip(np.rint(back.reshape(rows, columns)), 0, 255)
    return result


def with_bar(image: NDArray[Any], rows: int, rng: np.random.Generator) -> NDArray[Any]:
    """Append a bar of `rows` rows: black, with words of bright strokes and a scale line."""
    high = np.iinfo(image.dtype).max if image.dtype.kind == "u" else float(image.max())
    bar = np.zeros((rows, image.shape[1]), dtype=image.dtype)
    bar[0] = high
    top, height = rows // 3, max(5, rows // 3)
    column = 10
    while column < image.shape[1] - 20:
        for _ in range(int(rng.integers(2, 7))):
            bar[top : top + height, column] = high
            bar[top + int(rng.integers(height)), column : column + 5] = high
            column += 8
            if column >= image.shape[1] - 20:
                break
        column += int(rng.integers(12, 60))
    bar[rows - max(2, rows // 6), image.shape[1] // 4 : image.shape[1] // 2] = high
    return np.concatenate([image, bar])


def blurred(image: FloatImage, sigma_px: float) -> FloatImage:
    """Gaussian blur, mirrored at the frame."""
    if sigma_px <= 0:
        return image
    return _along(_along(image, sigma_px, 0), sigma_px, 1)


def _along(image: FloatImage, sigma_px: float, axis: int) -> FloatImage:
    reach = max(1, int(np.ceil(4 * sigma_px)))
    offsets = np.arange(-reach, reach + 1)
    kernel = np.exp(-0.5 * (offsets / sigma_px) ** 2)
    kernel /= kernel.sum()
    pad = [(0, 0), (0, 0)]
    pad[axis] = (reach, reach)
    padded = np.pad(image, pad, mode="reflect" if image.shape[axis] > reach else "edge")
    result = np.zeros_like(image)
    size = image.shape[axis]
    for k, weight in enumerate(kernel):
        window = padded[k : k + size] if axis == 0 else padded[:, k : k + size]
        result += np.float32(weight) * window
    return result
