"""Sums over the labels of an image, strip by strip, and what follows from them."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from phaseid.image.noise import NoiseLaw
from phaseid.image.region_sums import RunSums
from phaseid.image.runs import Runs

FloatArray = NDArray[np.float64]

# Greys of places this far apart are taken as independent of each other.
BLOCK = 64
# Error of any mean from borders drawn a little wrong, as a share of the pixel noise.
SYSTEMATIC = 0.01


def _zeros() -> FloatArray:
    return np.zeros(256)


@dataclass(eq=False)
class LabelSums:
    """Sums by label; arrays of shape (256,)."""

    pixels: FloatArray = field(default_factory=_zeros)
    interior: FloatArray = field(default_factory=_zeros)
    grey: FloatArray = field(default_factory=_zeros)
    grey_all: FloatArray = field(default_factory=_zeros)
    square: FloatArray = field(default_factory=_zeros)
    shade: FloatArray = field(default_factory=_zeros)
    shade_all: FloatArray = field(default_factory=_zeros)
    shade_grey: FloatArray = field(default_factory=_zeros)
    shade_square: FloatArray = field(default_factory=_zeros)
    low: FloatArray = field(default_factory=_zeros)
    high: FloatArray = field(default_factory=_zeros)
    blocks: list[tuple[NDArray[np.int64], FloatArray, FloatArray, FloatArray]] = field(
        default_factory=list
    )

    def add(self, runs: Runs, sums: RunSums, block_columns: int) -> None:
        """Add the runs of a strip that begins at a multiple of the block."""
        label = runs.label

        def total(values: NDArray[np.generic]) -> FloatArray:
            return np.bincount(label, weights=values, minlength=256).astype(np.float64)

        self.pixels += total(runs.pixels)
        self.interior += total(sums.interior)
        self.grey += total(sums.grey_interior)
        self.grey_all += total(sums.grey_all)
        self.shade += total(sums.interior * sums.shade)
        self.shade_all += total(runs.pixels * sums.shade)
        self.shade_grey += total(sums.grey_interior * sums.shade)
        self.shade_square += total(sums.interior * sums.shade**2)
        place = (runs.row // BLOCK) * block_columns + runs.start // BLOCK
        key = place.astype(np.int64) * 256 + label
        unique, at = np.unique(key, return_inverse=True)
        self.blocks.append(
            (
                unique,
                np.bincount(at, weights=sums.interior).astype(np.float64),
                np.bincount(at, weights=sums.grey_interior).astype(np.float64),
                np.bincount(at, weights=sums.interior * sums.shade).astype(np.float64),
            )
        )

    def means(self, noise: NoiseLaw) -> tuple[FloatArray, FloatArray]:
        """Mean and standard deviation of the interior of each label, shading taken off.

        A label without any interior is measured on all it has.
        """
        thin = self.interior < 1
        n = np.maximum(np.where(thin, self.pixels, self.interior), 1.0)
        raw = np.where(thin, self.grey_all, self.grey) / n
        slant = noise.sd(raw)
        mean = raw - slant * np.where(thin, self.shade_all, self.shade) / n
        square = self.square - 2 * slant * self.shade_grey + slant**2 * self.shade_square
        variance = np.where(thin, noise.variance(raw), square / n - mean**2)
        return mean, np.sqrt(np.maximum(variance, 0.0))

    def errors(self, noise: NoiseLaw) -> FloatArray:
        """Standard error of each mean from the scatter of distant places, and at least that of chance."""
        mean, _ = self.means(noise)
        thin = self.interior < 1
        n = np.maximum(np.where(thin, self.pixels, self.interior), 1.0)
        raw = np.where(thin, self.grey_all, self.grey) / n
        key, counted, grey, shade = (np.concatenate([b[k] for b in self.blocks]) for k in range(4))
        label = (key % 256).astype(np.intp)
        deviation = grey - noise.sd(raw)[label] * shade - counted * mean[label]
        squares = np.bincount(label, weights=deviation**2, minlength=256)
        number = np.bincount(label, weights=counted > 0, minlength=256)
        # Few blocks underestimate the scatter; widen as Student's t would.
        widen = np.sqrt(number / np.maximum(number - 1, 1)) * (1 + 2.0 / np.maximum(number, 1))
        between = np.where((number > 1) & ~thin, widen * np.sqrt(squares) / n, 0.0)
        sd = noise.sd(mean)
        chance = sd * np.sqrt(noise.correlated_pixels / n)
        return np.asarray(np.hypot(np.maximum(between, chance), SYSTEMATIC * sd))
