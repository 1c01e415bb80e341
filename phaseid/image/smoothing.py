"""Locally averaged greys of a whole image, in grey units, for the cuts a user makes by hand."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from phaseid.image.canvas import Canvas, in_parallel
from phaseid.image.filters import pyramid
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
