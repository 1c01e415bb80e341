"""The noise law of an image, from differences between neighbouring pixels."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

BLOCK = 8
LAGS = 4
GREY_BINS = 24
FEWEST_BLOCKS = 12
# Blocks without edges have the smallest variances: a low quantile finds them in any texture, and all
# blocks not much noisier than that are used.
QUANTILE = 0.15
ACCEPTED = 1.25
MOST_BLOCKS = 60_000
ROUNDS = 40
# A slope that explains less of the scatter than this is chance.
SLOPE_GAIN = 0.75


@dataclass(frozen=True)
class NoiseLaw:
    """Variance of a pixel of true grey g: ``constant + slope * g``.

    Attributes
    ----------
    constant, slope : float
    row, column : tuple of float
        Autocorrelation of the noise at lags 1, 2, ... along a row and down a column; empty for white noise.
    lowest_variance : float
        The law does not go below this.
    """

    constant: float
    slope: float
    row: tuple[float, ...] = ()
    column: tuple[float, ...] = ()
    lowest_variance: float = 1e-12

    @property
    def correlated_pixels(self) -> float:
        """Pixels that count as one independent pixel in a mean over many."""
        return (1.0 + 2.0 * sum(self.row)) * (1.0 + 2.0 * sum(self.column))

    def variance(self, grey: Any) -> Any:
        """Pixel variance at a grey."""
        return np.maximum(self.constant + self.slope * np.asarray(grey, dtype=float), self.floor)

    def sd(self, grey: Any) -> Any:
        """Pixel standard deviation at a grey."""
        return np.sqrt(self.variance(grey))

    @property
    def floor(self) -> float:
        """Smallest variance the law gives, so that a grey below all seen ones still has one."""
        return self.lowest_variance

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
        return NoiseLaw(max(spread, step, 1e-12), 0.0, lowest_variance=max(step, 1e-12))
    grey = blocks.mean(axis=(1, 2))
    rows, columns = _differences(blocks)
    usable = np.flatnonzero(~_clipped(blocks, data))
    if len(usable) < FEWEST_BLOCKS:
        usable = np.arange(len(grey))
    usable = usable[np.argsort(grey[usable], kind="stable")]
    parts = np.array_split(usable, min(GREY_BINS, max(1, len(usable) // (2 * FEWEST_BLOCKS))))
    picks = [_quiet(part, rows, columns) for part in parts]
    level = np.array([grey[pick].mean() for pick in picks])
    variance = np.array([_full_variance(rows[:, pick], columns[:, pick]) for pick in picks])
    variance /= _selection_bias()
    # Pure greys crowd into narrow bins; wide ones hold blends, whose blocks are never quiet.
    width = np.array([np.ptp(grey[part]) for part in parts]) + 1e-9
    weight = np.minimum(1.0, np.median(width) / width) * [len(pick) for pick in picks]
    constant, slope = _line(level, variance, weight)
    near = np.abs(variance - (constant + slope * level)) <= 0.3 * (constant + slope * level)
    quiet = np.concatenate([p for p, n in zip(picks, near, strict=True) if n] or picks)
    row = _correlation(rows[:, quiet])
    column = _correlation(columns[:, quiet])
    lowest = max(step, 0.25 * float(constant + slope * level.min()), 1e-12)
    return NoiseLaw(constant, slope, row, column, lowest)


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


def _differences(blocks: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Half mean squared differences at lags 1 to 4, shape (lags, blocks), along rows and columns."""
    rows = np.stack([_lagged(blocks, k, 2) for k in range(1, LAGS + 1)])
    columns = np.stack([_lagged(blocks, k, 1) for k in range(1, LAGS + 1)])
    return rows, columns


def _quiet(part: NDArray[np.intp], rows: FloatArray, columns: FloatArray) -> NDArray[np.intp]:
    near = rows[0, part] + columns[0, part]
    limit = ACCEPTED * float(np.quantile(near, QUANTILE))
    return np.asarray(part[near <= limit], dtype=np.intp)


def _full_variance(rows: FloatArray, columns: FloatArray) -> float:
    """Variance of a pixel: the differences at the lag where the correlation has died away."""
    return float(max(rows.mean(axis=1).max(), columns.mean(axis=1).max()))


@lru_cache(maxsize=1)
def _selection_bias() -> float:
    """What the choice of quiet blocks does to noise of variance one."""
    white = np.random.default_rng(0).standard_normal((4000, BLOCK, BLOCK))
    rows, columns = _differences(white)
    pick = _quiet(np.arange(len(white)), rows, columns)
    return _full_variance(rows[:, pick], columns[:, pick])


def _line(level: FloatArray, variance: FloatArray, weight: FloatArray) -> tuple[float, float]:
    """Straight line by weighted absolute deviations, rising or flat."""
    spread = float(np.ptp(level))
    if len(level) < 3 or spread <= 0:
        return float(np.median(variance)), 0.0
    scale = weight.copy()
    constant, slope = float(np.average(variance, weights=weight)), 0.0
    for _ in range(ROUNDS):
        w = scale / np.maximum(variance.mean(), 1e-300) ** 2
        centre = np.average(level, weights=w)
        slope = float(
            np.sum(w * (level - centre) * variance) / max(np.sum(w * (level - centre) ** 2), 1e-300)
        )
        slope = max(slope, 0.0)
        constant = float(np.average(variance, weights=w) - slope * centre)
        residual = variance - constant - slope * level
        typical = np.median(np.abs(residual)) + 1e-12 * (1 + variance.mean())
        # Edges and texture only ever add variance: a point above the line says less than one below.
        trust = np.where(residual > 0, 0.4, 1.0)
        scale = weight * trust / np.maximum(np.abs(residual), 0.3 * typical)
    flat = float(np.median(variance))
    left = np.sum(weight * np.abs(variance - constant - slope * level))
    if left > SLOPE_GAIN * np.sum(weight * np.abs(variance - flat)):
        return flat, 0.0
    # The law must stay positive over the greys it was seen on.
    lowest = float(level.min())
    if constant + slope * lowest <= 0:
        slope = float(np.median(variance / np.maximum(level - lowest + 0.05 * spread, 1e-300)))
        constant = -slope * (lowest - 0.05 * spread)
    return constant, slope


def _correlation(lagged: FloatArray) -> tuple[float, ...]:
    """Autocorrelation at lags 1 to 3 from half mean squared differences at lags 1 to 4."""
    mean = np.median(lagged, axis=1)
    full = max(float(mean.max()), 1e-300)
    found = np.clip(1.0 - mean[:-1] / full, 0.0, 1.0)
    # Chance alone gives a per cent or two.
    return tuple(float(v) if v > 0.02 else 0.0 for v in found)
