"""The contrast of specks hardly wider than the blur, from their flux and their height.

Flux (the sum of what a speck adds) is contrast times area, whatever the blur; the height of its smoothed
image depends on both differently. Discs are assumed; specks of one phase share their contrast.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from phaseid.image.filters import kernel_of

FloatArray = NDArray[np.float64]

FINE = 4
LARGEST_RADIUS = 12.0
# The contrast of what is smaller than the blur cannot be told; this is the smallest disc considered.
SMALLEST_RADIUS = 1.3
# A maximum over some pixels lies above the true height by about this many of its standard errors.
MAXIMUM_BIAS = 0.5
TRIALS = 400


@lru_cache(maxsize=32)
def height_table(blur_px: float, steps: int) -> tuple[FloatArray, FloatArray]:
    """Height of the smoothed, blurred image of discs of contrast one.

    Parameters
    ----------
    blur_px : float
    steps : int
        Smoothing steps.

    Returns
    -------
    radius, height : ndarray
    """
    radius = np.concatenate([np.arange(0.5, 4.0, 0.25), np.arange(4.0, LARGEST_RADIUS + 0.1, 1.0)])
    half = int(np.ceil(LARGEST_RADIUS + 4 * blur_px + len(kernel_of(steps)))) * FINE
    axis = np.arange(-half, half + 1) / FINE
    distance = np.hypot(axis[:, None], axis)
    blur = _gaussian(blur_px * FINE)
    kernel = kernel_of(steps)
    reach = len(kernel) // 2
    height = np.empty(len(radius))
    for n, r in enumerate(radius):
        disc = np.clip((r - distance) * FINE + 0.5, 0.0, 1.0)
        image = _separable(disc, blur)
        # The speck's middle lies anywhere within the brightest pixel.
        offsets = [-FINE // 4, 0, FINE // 4]
        values = []
        for dy in offsets:
            for dx in offsets:
                at = np.arange(-reach, reach + 1) * FINE + half
                values.append(float(kernel @ image[np.ix_(at + dy, at + dx)] @ kernel))
        height[n] = np.mean(values)
    return radius, height


def _gaussian(sd: float) -> FloatArray:
    reach = max(1, int(np.ceil(3.5 * sd)))
    kernel = np.exp(-0.5 * (np.arange(-reach, reach + 1) / max(sd, 1e-3)) ** 2)
    return np.asarray(kernel / kernel.sum())


def _separable(image: FloatArray, kernel: FloatArray) -> FloatArray:
    first = np.apply_along_axis(lambda line: np.convolve(line, kernel, "same"), 0, image)
    return np.apply_along_axis(lambda line: np.convolve(line, kernel, "same"), 1, first)


def contrast_of(
    flux: FloatArray,
    flux_se: FloatArray,
    height: FloatArray,
    height_se: float,
    blur_px: float,
    steps: int,
) -> tuple[float, float]:
    """Common contrast of specks, by least squares over their heights given their fluxes.

    Parameters
    ----------
    flux, flux_se, height : ndarray of shape (specks,)
        Positive for what adds to its surroundings.
    height_se : float
    blur_px : float
    steps : int

    Returns
    -------
    contrast, standard error : float
    """
    radius, table = height_table(round(blur_px, 1), steps)
    seen = np.maximum(height - MAXIMUM_BIAS * height_se, 1e-6)
    low = float(np.max(seen.min() / table[-1], initial=1e-6))
    highest = float(np.max(seen) / np.interp(SMALLEST_RADIUS, radius, table))
    trial = np.geomspace(max(low, 1e-6), max(highest, 1.01 * low), TRIALS)
    size = np.sqrt(np.maximum(flux, 1e-9)[:, None] / (np.pi * trial))
    expected = trial * np.interp(np.maximum(size, SMALLEST_RADIUS), radius, table)
    # The flux enters through the size: d(height)/d(flux) by differences.
    shifted = np.sqrt(np.maximum(flux + flux_se, 1e-9)[:, None] / (np.pi * trial))
    moved = trial * np.interp(np.maximum(shifted, SMALLEST_RADIUS), radius, table) - expected
    # Grains are no discs; their heights scatter by some per cent for it.
    variance = height_se**2 + moved**2 + (0.04 * expected) ** 2
    misfit = ((seen[:, None] - expected) ** 2 / variance + np.log(variance)).sum(axis=0)
    likelihood = np.exp(-0.5 * (misfit - misfit.min()))
    likelihood /= likelihood.sum()
    mean = float(likelihood @ trial)
    return mean, float(np.sqrt(likelihood @ (trial - mean) ** 2)) + 1e-9
