"""Greys of places that are flat: histograms of local means in which edges and blends do not count.

A place is flat at a scale if the local mean differs from its neighbours a kernel's width away by no more
than the noise explains, at that scale and all finer ones. Flat places at coarse scales know their grey
far better than a pixel does; places in small grains are flat at fine scales only.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from phaseid.image.canvas import Canvas, Tile, in_parallel
from phaseid.image.filters import pyramid, unevenness
from phaseid.image.response import Response

STEPS = 4
# Of the mean square of four differences, in units of its expectation; noise alone stays below it in
# about 19 of 20 places.
FLAT_LIMIT = 2.4
BINS_PER_SD = 5.0
# Side of the blocks in which slopes are averaged.
SLOPE_BLOCK = 60
SLOPE_STEP = 3


@dataclass(frozen=True, eq=False)
class FlatCounts:
    """Histograms of flat places, one per scale.

    Attributes
    ----------
    low : float
        Position of the lower end of the first bin, on the noise axis.
    width : ndarray of shape (STEPS + 1,)
        Width of a bin at each scale; scale 0 is not used.
    counts : list of ndarray
        Counts per scale.
    pixels : int
        Pixels looked at.
    slopes : ndarray of shape (blocks, 5)
        Row, column, slope down, slope along (per pixel), and weight of blocks of the image.
    """

    low: float
    width: NDArray[np.float64]
    counts: list[NDArray[np.int64]]
    pixels: int
    slopes: NDArray[np.float64]

    def share(self, step: int) -> float:
        """Share of the pixels that is flat at a scale."""
        return float(self.counts[step].sum()) / max(self.pixels, 1)

    def centres(self, step: int) -> NDArray[np.float64]:
        """Middle of each bin."""
        return np.asarray(self.low + (np.arange(len(self.counts[step])) + 0.5) * self.width[step])

    def bluntness(self) -> float:
        """Entropy of the flat greys, less the logarithm of their share: lower is sharper.

        Taken at the second scale, where all but small grains have flat places.
        """
        step = 2 if self.share(2) > 0.1 else 1
        p = self.counts[step] / max(self.counts[step].sum(), 1)
        p = p[p > 0]
        entropy = float(-(p * np.log(p / self.width[step])).sum())
        return entropy - float(np.log(max(self.share(step), 1e-9)))


def count_flat(
    canvas: Canvas,
    response: Response,
    tiles: Sequence[Tile],
    span: tuple[float, float],
    progress: Callable[[float], None] | None = None,
) -> FlatCounts:
    """Count flat places over tiles.

    Parameters
    ----------
    canvas : Canvas
    response : Response
    tiles : sequence of Tile
    span : (float, float)
        Lowest and highest position on the noise axis.
    progress : callable, optional
        Called with the share done.

    Returns
    -------
    FlatCounts
    """
    table = canvas.axis.table(canvas.data.dtype)
    low = span[0] - 1.0
    width = response.level / BINS_PER_SD
    size = np.minimum(np.ceil((span[1] + 1.0 - low) / width), 4_000_000).astype(int) + 1
    width = np.maximum(width, (span[1] + 1.0 - low) / (size - 1))
    counts = [np.zeros(n, dtype=np.int64) for n in size]
    counts[0] = np.zeros(0, dtype=np.int64)
    slopes = []
    pixels = 0

    def work(tile: Tile) -> tuple[list[tuple[int, NDArray[np.int64]]], NDArray[np.float64], int]:
        return _tile(canvas, response, tile, table, low, width, size)

    for n, (found, block, used) in enumerate(in_parallel(work, tiles)):
        for step, (first, part) in enumerate(found, start=1):
            counts[step][first : first + len(part)] += part
        slopes.append(block)
        pixels += used
        if progress is not None:
            progress((n + 1) / len(tiles))
    gathered = np.concatenate(slopes) if slopes else np.zeros((0, 5))
    return FlatCounts(low, width, counts, pixels, gathered)


def _tile(
    canvas: Canvas,
    response: Response,
    tile: Tile,
    table: NDArray[np.float32] | None,
    low: float,
    width: NDArray[np.float64],
    size: NDArray[np.intp],
) -> tuple[list[tuple[int, NDArray[np.int64]]], NDArray[np.float64], int]:
    levels = pyramid(canvas.greys(tile, table), STEPS)
    out = canvas.left_out(tile)
    inner_out = None if out is None else out[tile.inner]
    flat: NDArray[np.bool_] | None = None
    found = []
    slopes = np.zeros((0, 5))
    for step in range(1, STEPS + 1):
        limit = np.float32(FLAT_LIMIT * response.difference[step] ** 2)
        here = unevenness(levels[step], 2**step)[tile.inner] < limit
        flat = here if flat is None else flat & here
        if step == 1 and inner_out is not None:
            flat &= ~inner_out
        values = levels[step][tile.inner][flat]
        bins = ((values - np.float32(low)) / np.float32(width[step])).astype(np.int64)
        np.clip(bins, 0, size[step] - 1, out=bins)
        if len(bins):
            first = int(bins.min())
            found.append((first, np.bincount(bins - first)))
        else:
            found.append((0, np.zeros(0, dtype=np.int64)))
        if step == SLOPE_STEP:
            slopes = _slopes(levels[step], flat, tile)
    pixels = flat.size - (0 if inner_out is None else int(inner_out.sum()))  # type: ignore[union-attr]
    return found, slopes, pixels


def _slopes(level: NDArray[np.float32], flat: NDArray[np.bool_], tile: Tile) -> NDArray[np.float64]:
    """Mean slopes of the flat places of each block."""
    hole = 2**SLOPE_STEP
    rows, columns = tile.inner
    down = (
        level[rows.start + hole : rows.stop + hole, columns]
        - level[rows.start - hole : rows.stop - hole, columns]
    )
    along = (
        level[rows, columns.start + hole : columns.stop + hole]
        - level[rows, columns.start - hole : columns.stop - hole]
    )
    found = []
    for r in range(0, flat.shape[0], SLOPE_BLOCK):
        for c in range(0, flat.shape[1], SLOPE_BLOCK):
            box = (slice(r, r + SLOPE_BLOCK), slice(c, c + SLOPE_BLOCK))
            chosen = flat[box]
            weight = int(chosen.sum())
            if weight < hole * hole:
                continue
            found.append(
                (
                    tile.rows.start + r + chosen.shape[0] / 2,
                    tile.columns.start + c + chosen.shape[1] / 2,
                    float(down[box][chosen].mean()) / (2 * hole),
                    float(along[box][chosen].mean()) / (2 * hole),
                    float(weight),
                )
            )
    return np.array(found).reshape(-1, 5)
