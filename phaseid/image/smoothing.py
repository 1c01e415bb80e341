"""Local averages and labels of a whole image by given greys, for the cuts a user makes by hand."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from phaseid.image.canvas import Canvas, in_parallel
from phaseid.image.filters import pyramid
from phaseid.image.labelling import Palette, label_tile
from phaseid.image.noise import NoiseLaw
from phaseid.image.shading import Shading
from phaseid.image.stabilise import NoiseAxis

STEPS = 2


def smoothed_greys(
    data: NDArray[Any], noise: NoiseLaw, shading: Shading, crop: tuple[int, int, int, int]
) -> NDArray[np.float32]:
    """Average over some ten pixels, shading taken off.

    Parameters
    ----------
    data : ndarray of shape (rows, columns)
    noise : NoiseLaw
    shading : Shading
    crop : (int, int, int, int)

    Returns
    -------
    ndarray of float32, shape (rows, columns)
        Zero outside the crop.
    """
    first, end, left, right = crop
    axis = NoiseAxis(noise)
    canvas = Canvas(data[first:end, left:right], axis, shading)
    table = axis.table(data.dtype)
    result = np.zeros(data.shape, dtype=np.float32)
    part = result[first:end, left:right]
    for tile, level in in_parallel(
        lambda t: (t, pyramid(canvas.greys(t, table), STEPS)[STEPS][t.inner]), canvas.tiles()
    ):
        part[tile.rows, tile.columns] = axis.back(level)
    return result


def labelled_by(
    data: NDArray[Any],
    noise: NoiseLaw,
    shading: Shading,
    crop: tuple[int, int, int, int],
    greys: Sequence[float],
) -> NDArray[np.uint8]:
    """Label every pixel with the index of one of the greys.

    Parameters
    ----------
    data : ndarray of shape (rows, columns)
    noise : NoiseLaw
    shading : Shading
    crop : (int, int, int, int)
    greys : sequence of float
        Ascending.

    Returns
    -------
    ndarray of uint8, shape (rows, columns)
        0 outside the crop.
    """
    first, end, left, right = crop
    axis = NoiseAxis(noise)
    canvas = Canvas(data[first:end, left:right], axis, shading)
    table = axis.table(data.dtype)
    position = axis.forward(np.array(greys))
    # Equal greys would leave nothing to tell them apart by; a hair keeps them in order.
    position += 1e-6 * np.arange(len(position))
    palette = Palette(position, np.ones(len(position)), float(np.sqrt(noise.correlated_pixels)))
    result = np.zeros(data.shape, dtype=np.uint8)
    part = result[first:end, left:right]
    for tile, labels in in_parallel(
        lambda t: (t, label_tile(pyramid(canvas.greys(t, table), STEPS), palette)[t.inner]),
        canvas.tiles(),
    ):
        part[tile.rows, tile.columns] = labels
    return result
