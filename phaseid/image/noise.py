"""The noise law of an image, from differences between neighbouring pixels."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

BLOCK = 16
LAGS = 4
GREY_BINS = 24
FEWEST_BLOCKS = 6
# Blocks without edges have the smallest variances; a low quantile picks them in any texture.
QUANTILE = 0.3
MOST_BLOCKS = 40_000


@dataclass(frozen=True)
class NoiseLaw:
    """Variance of a pixel of true grey g: ``constant + slope * g``.

    Attributes
    ----------
    constant, slope : float
    correlation_row, correlation_column : float
        Sum of the noise's autocorrelation over all lags along a row and down a column; 1 for white noise.
    """

    constant: float
    slope: float
    correlation_row: float = 1.0
    correlation_column: float = 1.0

    @property
    def correlated_pixels(self) -> float:
        """Pixels that count as one independent pixel in a mean over many."""
        return self.correlation_row * self.correlation_column

    def variance(self, grey: Any) -> Any:
        """Pixel variance at a grey."""
        return np.maximum(self.constant + self.slope * np.asarray(grey, dtype=float), self.floor)

    def sd(self, grey: Any) -> Any:
        """Pixel standard deviation at a grey."""
        return np.sqrt(self.variance(grey))

    @property
    def floor(self) -> float:
        """Smallest variance the law gives: that of rounding, or a millionth of the greys."""
        return 1e-12 + 0.0 * self.constant

    @property
    def pair(self) -> tuple[float, float]:
        """`(constant, slope)`."""
        return self.constant, self.slope


def estimate_noise(data: NDArray[Any]) -> NoiseLaw:
    """Estimate the noise law.

    Blocks of 16 x 16 pixels give a variance from the differences of neighbours, which edges and slow
    shading enter little; within each range of greys the quieter blocks are taken.

    Parameters
    ----------
    data : ndarray of shape (rows, columns)

    Returns
    -------
    NoiseLaw
    """
    blocks = _blocks(data)
    step = 1.0 / 12.0 if data.dtype.kind == "u" else 0.0
    if blocks is None:
        spread = float(np.var(np.diff(data.astype(np.float64), axis=1))) / 2
        return NoiseLaw(max(spread, step, 1e-12), 0.0)
    grey = blocks.mean(axis=(1, 2))
    rows = np.stack([_lagged(blocks, k, 2) for k in range(1, LAGS + 1)])
    columns = np.stack([_lagged(blocks, k, 1) for k in range(1, LAGS + 1)])
    far = 0.5 * (rows[-1] + columns[-1])
    near = np.minimum(rows[0], columns[0])
    level, variance, weight, quiet = _by_grey(grey, near, far, _clipped(blocks, data))
    constant, slope = _line(level, variance, weight)
    row = _correlation(rows[:, quiet])
    column = _correlation(columns[:, quiet])
    low = constant + slope * float(level.min())
    if low < step:
        constant += step - min(low, step)
    return NoiseLaw(constant, slope, row, column)


def _blocks(data: NDArray[Any]) -> FloatArray | None:
    r, c = data.shape[0] // BLOCK, data.shape[1] // BLOCK
    if r * c < FEWEST_BLOCKS:
        return None
    step = max(1, int(np.ceil(np.sqrt(r * c / MOST_BLOCKS))))
    view = data[: r * BLOCK, : c * BLOCK].reshape(r, BLOCK, c, BLOCK)[::step, :, ::step]
    picked = np.ascontiguousarray(view.transpose(0, 2, 1, 3), dtype=np.float32)
    return picked.reshape(-1, BLOCK, BLOCK)  # type: ignore[return-value]


def _lagged(blocks: FloatArray, lag: int, axis: int) -> FloatArray:
    """Half the mean squared difference at a lag, less the part of a plane through the block."""
    size = blocks.shape[axis]
    a = np.take(blocks, range(lag, size), axis=axis)
    b = np.take(blocks, range(size - lag), axis=axis)
    difference = a - b
    slope = difference.mean(axis=(1, 2))
    return np.asarray(0.5 * ((difference**2).mean(axis=(1, 2)) - slope**2), dtype=float)


def _clipped(blocks: FloatArray, data: NDArray[Any]) -> NDArray[np.bool_]:
    low, high = float(data.min()), float(data.max())
    cut = ((blocks == low) | (blocks == high)).mean(axis=(1, 2))
    return np.asarray(cut > 0.01)


def _by_grey(
    grey: FloatArray, near: FloatArray, far: FloatArray, clipped: NDArray[np.bool_]
) -> tuple[FloatArray, FloatArray, FloatArray, NDArray[np.intp]]:
    usable = np.flatnonzero(~clipped)
    if len(usable) < FEWEST_BLOCKS:
        usable = np.arange(len(grey))
    usable = usable[np.argsort(grey[usable], kind="stable")]
    parts = np.array_split(usable, min(GREY_BINS, max(1, len(usable) // FEWEST_BLOCKS)))
    level, variance, weight, quiet = [], [], [], []
    for part in parts:
        limit = np.quantile(near[part], QUANTILE)
        chosen = part[near[part] <= limit]
        # The mean of the lowest share lies below the mean of all by what chance alone does.
        level.append(grey[chosen].mean())
        variance.append(np.median(far[chosen]))
        weight.append(len(chosen))
        quiet.append(chosen)
    return np.array(level), np.array(variance), np.array(weight, float), np.concatenate(quiet)


def _line(level: FloatArray, variance: FloatArray, weight: FloatArray) -> tuple[float, float]:
    """Straight line by weighted absolute deviations, rising or flat."""
    spread = float(np.ptp(level))
    if len(level) < 3 or spread <= 0:
        return float(np.median(variance)), 0.0
    scale = weight.copy()
    constant, slope = float(np.average(variance, weights=weight)), 0.0
    for _ in range(30):
        w = scale / np.maximum(variance.mean(), 1e-300) ** 2
        centre = np.average(level, weights=w)
        slope = float(
            np.sum(w * (level - centre) * variance) / max(np.sum(w * (level - centre) ** 2), 1e-300)
        )
        slope = max(slope, 0.0)
        constant = float(np.average(variance, weights=w) - slope * centre)
        residual = np.abs(variance - constant - slope * level)
        typical = np.median(residual) + 1e-12 * (1 + variance.mean())
        scale = weight / np.maximum(residual, 0.3 * typical)
    # The law must stay positive over the greys it was seen on.
    lowest = float(level.min())
    if constant + slope * lowest <= 0:
        slope = float(np.median(variance / np.maximum(level - lowest + 0.05 * spread, 1e-300)))
        constant = -slope * (lowest - 0.05 * spread)
    return constant, slope


def _correlation(lagged: FloatArray) -> float:
    """Sum of the autocorrelation from half mean squared differences at lags 1 to 4."""
    mean = np.median(lagged, axis=1)
    full = max(float(mean.max()), 1e-300)
    return float(max(1.0, 1.0 + 2.0 * np.sum(1.0 - mean / full)))
