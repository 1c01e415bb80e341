"""Greys that no mode explains: uneven pores, resin, textured phases that are nowhere flat."""

from __future__ import annotations

import itertools
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from phaseid.image.canvas import Canvas, Tile, in_parallel
from phaseid.image.filters import extreme_labels, pyramid
from phaseid.image.labelling import Palette
from phaseid.image.modes import Mode, smooth_counts

FloatArray = NDArray[np.float64]

# Pixels whose smoothed grey is this many standard deviations from every label.
UNEXPLAINED = 4.5
# Such pixels must fill squares of this half side to be more than an edge.
CORE = 2
WIDE_CORE = 5
LEAST_SHARE = 0.002
BINS = 512
# Width of the smoothing as a share of the grey range: uneven places have no narrow peaks.
BANDWIDTH = 0.03
VALLEY = 0.6
MOST = 4


def leftover_modes(
    canvas: Canvas, palette: Palette, tiles: Sequence[Tile], span: tuple[float, float]
) -> list[Mode]:
    """Find broad modes of what the palette leaves unexplained.

    Parameters
    ----------
    canvas : Canvas
    palette : Palette
    tiles : sequence of Tile
    span : (float, float)
        Range on the noise axis.

    Returns
    -------
    list of Mode
    """
    table = canvas.axis.table(canvas.data.dtype)
    edges = np.linspace(span[0], span[1], BINS + 1)

    def work(tile: Tile) -> tuple[NDArray[np.int64], int]:
        level = pyramid(canvas.greys(tile, table), 1)[1]
        far = np.full(level.shape, np.inf, dtype=np.float32)
        for position, variance in zip(palette.position, palette.variance, strict=True):
            width = np.float32(palette.scale * np.sqrt(variance - 0.8))
            np.minimum(far, np.abs(level - np.float32(position)) / width, out=far)
        odd = (far > UNEXPLAINED).astype(np.uint8)
        # Between two labels an unexplained grey is most likely a blend: it must fill a wider square.
        between = (level > palette.position[0]) & (level < palette.position[-1])
        core = (extreme_labels(odd, CORE)[0] > 0) & ~between
        core |= extreme_labels(odd, WIDE_CORE)[0] > 0
        out = canvas.left_out(tile)
        if out is not None:
            core &= ~out
        counts, _ = np.histogram(level[tile.inner][core[tile.inner]], bins=edges)
        return counts, int(core[tile.inner].size)

    counts = np.zeros(BINS, dtype=np.int64)
    pixels = 0
    for found, seen in in_parallel(work, tiles):
        counts += found
        pixels += seen
    return _broad_modes(counts.astype(float), edges, pixels)


def _broad_modes(counts: FloatArray, edges: FloatArray, pixels: int) -> list[Mode]:
    total = counts.sum()
    if total < LEAST_SHARE * pixels:
        return []
    density = smooth_counts(counts, BANDWIDTH * BINS)
    inner = (density[1:-1] > density[:-2]) & (density[1:-1] >= density[2:])
    peaks = [int(p) + 1 for p in np.flatnonzero(inner)] or [int(np.argmax(density))]
    # Shallow valleys do not part what is broad anyway.
    while len(peaks) > 1:
        depth = [
            density[a : b + 1].min() / min(density[a], density[b])
            for a, b in itertools.pairwise(peaks)
        ]
        shallow = int(np.argmax(depth))
        if depth[shallow] < VALLEY and len(peaks) <= MOST:
            break
        drop = shallow if density[peaks[shallow]] < density[peaks[shallow + 1]] else shallow + 1
        del peaks[drop]
    cuts = [0]
    cuts += [a + int(np.argmin(density[a : b + 1])) for a, b in itertools.pairwise(peaks)]
    cuts.append(len(counts))
    centres = (edges[1:] + edges[:-1]) / 2
    modes = []
    for a, b in itertools.pairwise(cuts):
        weight = counts[a:b]
        if weight.sum() < 0.25 * LEAST_SHARE * pixels:
            continue
        mean = float(weight @ centres[a:b] / weight.sum())
        spread = float(np.sqrt(weight @ (centres[a:b] - mean) ** 2 / weight.sum()))
        modes.append(Mode(mean, max(spread, 1.0), 1, float(weight.sum()) / 9.0))
    return modes
