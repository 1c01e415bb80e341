"""Smoothing at doubling scales, in place and inside the processor's cache.

The kernel at each step is 1-2-1 with holes (the "à trous" scheme, Holschneider et al. 1989): three steps
cost as much as one small filter and average over some 130 pixels.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

FloatImage = NDArray[np.float32]

KERNEL = np.array([0.25, 0.5, 0.25])


def smoothed(image: FloatImage, hole: int) -> FloatImage:
    """One step: 1-2-1 over pixels `hole` apart, along both axes; the outermost `hole` pixels stay."""
    return _along_columns(_along_rows(image, hole), hole)


def _along_rows(image: FloatImage, hole: int) -> FloatImage:
    out = image.copy()
    if image.shape[0] > 2 * hole:
        inner = out[hole:-hole]
        inner *= np.float32(2.0)
        inner += image[: -2 * hole]
        inner += image[2 * hole :]
        inner *= np.float32(0.25)
    return out


def _along_columns(image: FloatImage, hole: int) -> FloatImage:
    out = image.copy()
    if image.shape[1] > 2 * hole:
        inner = out[:, hole:-hole]
        inner *= np.float32(2.0)
        inner += image[:, : -2 * hole]
        inner += image[:, 2 * hole :]
        inner *= np.float32(0.25)
    return out


def gathered(count: NDArray[np.uint16], hole: int) -> NDArray[np.uint16]:
    """Sixteen times one step of smoothing, in integers; the frame repeats its outermost pixels."""
    down = count << np.uint16(2)
    inner = down[hole:-hole]
    np.left_shift(count[hole:-hole], np.uint16(1), out=inner)
    inner += count[: -2 * hole]
    inner += count[2 * hole :]
    both = down << np.uint16(2)
    inner = both[:, hole:-hole]
    np.left_shift(down[:, hole:-hole], np.uint16(1), out=inner)
    inner += down[:, : -2 * hole]
    inner += down[:, 2 * hole :]
    return both


def pyramid(image: FloatImage, steps: int) -> list[FloatImage]:
    """The image and its smoothed versions after 1, 2, ... steps."""
    levels = [image]
    for step in range(steps):
        levels.append(smoothed(levels[-1], 2**step))
    return levels


def unevenness(image: FloatImage, hole: int) -> FloatImage:
    """Mean squared difference to the four neighbours `hole` pixels away; infinite near the rim.

    Slopes, ridges, valleys and peaks all raise it.
    """
    down = image[hole:] - image[:-hole]
    down *= down
    along = image[:, hole:] - image[:, :-hole]
    along *= along
    out = np.full_like(image, np.inf)
    inner = out[hole:-hole, hole:-hole]
    np.add(down[hole:, hole:-hole], down[:-hole, hole:-hole], out=inner)
    inner += along[hole:-hole, hole:]
    inner += along[hole:-hole, :-hole]
    inner *= np.float32(0.25)
    return out


def kernel_of(steps: int) -> NDArray[np.float64]:
    """One-dimensional kernel of `steps` steps."""
    kernel = np.ones(1)
    for step in range(steps):
        spread = np.zeros(2 * 2**step + 1)
        spread[:: 2**step] = KERNEL
        kernel = np.convolve(kernel, spread)
    return kernel


def extreme_labels(
    labels: NDArray[np.uint8], reach: int
) -> tuple[NDArray[np.uint8], NDArray[np.uint8]]:
    """Lowest and highest label within a square of side ``2 * reach + 1``."""
    low = _running(labels, reach, np.minimum)
    high = _running(labels, reach, np.maximum)
    return low, high


def _running(labels: NDArray[np.uint8], reach: int, pick: Any) -> NDArray[np.uint8]:
    out = labels
    for axis in (0, 1):
        result = out.copy()
        for shift in range(1, reach + 1):
            if axis == 0:
                pick(result[shift:], out[:-shift], out=result[shift:])
                pick(result[:-shift], out[shift:], out=result[:-shift])
            else:
                pick(result[:, shift:], out[:, :-shift], out=result[:, shift:])
                pick(result[:, :-shift], out[:, shift:], out=result[:, :-shift])
        out = result
    return out
