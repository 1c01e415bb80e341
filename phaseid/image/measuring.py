"""From a label map to clusters and regions with their greys and honest standard errors."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from phaseid.image.clusters import REGION_FIELDS
from phaseid.image.filters import extreme_labels
from phaseid.image.noise import NoiseLaw
from phaseid.image.runs import Runs, joined, regions_of, runs_of
from phaseid.image.shading import Shading

FloatArray = NDArray[np.float64]

STRIP = 256
# Pixels nearer to another label than this many standard deviations of the blur are blends.
EDGE_BLURS = 2.5
EDGE_LIMITS = (2, 6)
# Error of any mean from borders drawn a little wrong, as a share of the pixel noise.
SYSTEMATIC = 0.01
# Greys of places this far apart are taken as independent of each other.
BLOCK = 64
# Above this share of cut-off pixels a mean is only a bound (common practice: about one per cent).
CLIPPED_SHARE = 0.01


@dataclass(frozen=True, eq=False)
class Measured:
    """Sums over clusters, and the region table.

    Attributes
    ----------
    pixels, interior, mean, sd, se, low, high : ndarray of shape (256,)
        By label: pixels, interior pixels, mean and standard deviation of the interior, standard error of
        the mean, share of interior pixels at the lower and upper end of the range.
    scatter : ndarray of shape (256,)
        Standard deviation of the greys of regions beyond what the noise explains.
    regions : ndarray of REGION_FIELDS
    edge : ndarray of uint8
        Packed bits, rows by rows.
    """

    pixels: FloatArray
    interior: FloatArray
    mean: FloatArray
    sd: FloatArray
    se: FloatArray
    low: FloatArray
    high: FloatArray
    scatter: FloatArray
    regions: NDArray[Any]
    edge: NDArray[np.uint8]

    def clipped(self, label: int) -> Literal["low", "high"] | None:
        """End at which a label's greys are cut off."""
        if max(self.low[label], self.high[label]) < CLIPPED_SHARE:
            return None
        return "low" if self.low[label] >= self.high[label] else "high"


def measure(
    data: NDArray[Any],
    labels: NDArray[np.uint8],
    noise: NoiseLaw,
    shading: Shading,
    offset: int,
    ends: tuple[float | None, float | None],
    pixel_size_nm: float | None,
    blur_px: float = 1.0,
    muted: NDArray[np.bool_] | None = None,
    progress: Callable[[float], None] | None = None,
) -> Measured:
    """Measure clusters and regions.

    Parameters
    ----------
    data, labels : ndarray of shape (rows, columns)
    noise : NoiseLaw
    shading : Shading
        Of the part of the image that begins at row `offset`.
    offset : int
    ends : (float or None, float or None)
        Greys at which the range is cut off.
    pixel_size_nm : float or None
    blur_px : float
        Standard deviation of the borders' blur; it decides how far a border reaches.
    muted : ndarray of bool, shape (rows of the part,), optional
        Rows whose greys do not count.
    progress : callable, optional

    Returns
    -------
    Measured
    """
    reach = int(np.clip(round(EDGE_BLURS * blur_px), *EDGE_LIMITS))
    rows, columns = data.shape
    packed = np.zeros((rows, -(-columns // 8)), dtype=np.uint8)
    parts: list[Runs] = []
    sums: list[FloatArray] = []
    for first in range(0, rows, STRIP):
        last = min(first + STRIP, rows)
        strip = labels[first:last]
        edge = _edges(labels, first, last, reach)
        if muted is not None:
            edge[_muted_rows(muted, offset, first, last)] = True
        packed[first:last] = np.packbits(edge, axis=1)
        runs, begins = runs_of(strip, first)
        parts.append(runs)
        sums.append(_sums(data[first:last], strip, edge, begins, runs, ends))
        if progress is not None:
            progress(last / rows)
    runs, total = joined(parts), np.concatenate(sums, axis=1)
    region, count = regions_of(runs, columns)
    by_run = _shading_at(runs, shading, offset)
    table = _table(runs, total, region, count, by_run, noise, pixel_size_nm, data.shape)
    return _by_label(runs, total, table, by_run, noise, packed, data.shape)


def _muted_rows(muted: NDArray[np.bool_], offset: int, first: int, last: int) -> NDArray[np.bool_]:
    at = np.arange(first, last) - offset
    inside = (at >= 0) & (at < len(muted))
    return np.where(inside, muted[np.clip(at, 0, len(muted) - 1)], False)


def _edges(labels: NDArray[np.uint8], first: int, last: int, reach: int) -> NDArray[np.bool_]:
    top, bottom = max(0, first - reach), min(labels.shape[0], last + reach)
    low, high = extreme_labels(labels[top:bottom], reach)
    inner = slice(first - top, first - top + last - first)
    return np.asarray((low != high)[inner])


def _sums(
    data: NDArray[Any],
    labels: NDArray[np.uint8],
    edge: NDArray[np.bool_],
    begins: NDArray[np.int64],
    runs: Runs,
    ends: tuple[float | None, float | None],
) -> FloatArray:
    """Per run: interior pixels, sum and sum of squares of their greys, pixels at either end, all greys."""
    if not len(begins):
        return np.zeros((6, 0))
    flat = data.ravel()
    inside = ~edge.ravel()
    grey = flat.astype(np.float64)
    # Gaps (label 0) lie between runs: sum up to the end of each run only.
    cuts = np.stack([begins, begins + runs.pixels], axis=1).ravel()
    inner = np.where(inside, grey, 0.0)
    result = np.empty((6, len(begins)))
    result[0] = _reduce(inside, cuts)
    result[1] = _reduce(inner, cuts)
    inner *= grey
    result[2] = _reduce(inner, cuts)
    low, high = ends
    result[3] = 0.0 if low is None else _reduce((flat <= low) & inside, cuts)
    result[4] = 0.0 if high is None else _reduce((flat >= high) & inside, cuts)
    result[5] = _reduce(grey, cuts)
    return result


def _reduce(values: NDArray[Any], cuts: NDArray[np.int64]) -> FloatArray:
    # reduceat needs every index inside; the last run may end at the very end.
    padded = np.append(values, values[-1:] * 0) if cuts[-1] == len(values) else values
    return np.add.reduceat(padded, cuts, dtype=np.float64)[::2]


def _shading_at(runs: Runs, shading: Shading, offset: int) -> FloatArray:
    """Shading at the middle of each run, in noise units."""
    if shading.none:
        return np.zeros(len(runs.row))
    middle = (runs.start + runs.stop - 1) / 2
    return shading.at(runs.row - offset, middle)


def _table(
    runs: Runs,
    sums: FloatArray,
    region: NDArray[np.int32],
    count: int,
    shading: FloatArray,
    noise: NoiseLaw,
    pixel_size_nm: float | None,
    shape: tuple[int, ...],
) -> NDArray[Any]:
    table = np.zeros(count, REGION_FIELDS)
    if not count:
        return table

    def total(values: NDArray[Any]) -> FloatArray:
        return np.bincount(region, weights=values, minlength=count).astype(np.float64)

    n = runs.pixels.astype(float)
    middle = (runs.start + runs.stop - 1) / 2
    pixels = total(n)
    interior = total(sums[0])
    row, column = total(n * runs.row) / pixels, total(n * middle) / pixels
    # Sum over a run of (column - mean)^2, in closed form.
    across = total(n * (middle - column[region]) ** 2 + n * (n * n - 1) / 12) / pixels + 1 / 12
    down = total(n * (runs.row - row[region]) ** 2) / pixels + 1 / 12
    both = total(n * (runs.row - row[region]) * (middle - column[region])) / pixels
    root = np.sqrt((across - down) ** 2 / 4 + both**2)
    large, small = (across + down) / 2 + root, (across + down) / 2 - root
    first = np.full(count, len(runs.row))
    np.minimum.at(first, region, np.arange(len(runs.row)))
    enough = interior > 0
    grey = np.where(enough, total(sums[1]) / np.maximum(interior, 1), total(sums[5]) / pixels)
    weight = np.where(enough[region], sums[0], n)
    tilt = total(weight * shading) / np.maximum(total(weight), 1e-9)
    table["region"] = np.arange(1, count + 1)
    table["cluster"] = runs.label[first]
    table["pixels"] = pixels
    table["interior_pixels"] = interior
    table["row"], table["column"] = row, column
    table["equivalent_diameter_px"] = np.sqrt(4 * pixels / np.pi)
    size_um = np.nan if pixel_size_nm is None else pixel_size_nm / 1000
    table["equivalent_diameter_um"] = table["equivalent_diameter_px"] * size_um
    table["area_um2"] = pixels * size_um**2
    table["grey_mean"] = grey - tilt * noise.sd(grey)
    effective = np.maximum(np.where(enough, interior, pixels) / noise.correlated_pixels, 1.0)
    table["grey_se"] = np.sqrt(noise.variance(grey) / effective)
    table["edge_share"] = 1.0 - interior / pixels
    table["elongation"] = np.sqrt(large / np.maximum(small, 1e-9))
    table["angle_deg"] = np.degrees(0.5 * np.arctan2(2 * both, across - down))
    _boxes(table, runs, region, shape)
    return table


def _boxes(
    table: NDArray[Any], runs: Runs, region: NDArray[np.int32], shape: tuple[int, ...]
) -> None:
    count = len(table)
    top, bottom = np.full(count, shape[0]), np.zeros(count, dtype=np.int64)
    left, right = np.full(count, shape[1]), np.zeros(count, dtype=np.int64)
    np.minimum.at(top, region, runs.row)
    np.maximum.at(bottom, region, runs.row + 1)
    np.minimum.at(left, region, runs.start)
    np.maximum.at(right, region, runs.stop)
    table["first_row"], table["first_column"] = top, left
    table["height"], table["width"] = bottom - top, right - left
    used_top, used_bottom = int(runs.row.min()), int(runs.row.max()) + 1
    table["touches_frame"] = (
        (top <= used_top) | (bottom >= used_bottom) | (left == 0) | (right == shape[1])
    )


def _by_label(
    runs: Runs,
    sums: FloatArray,
    table: NDArray[Any],
    shading: FloatArray,
    noise: NoiseLaw,
    packed: NDArray[np.uint8],
    shape: tuple[int, ...],
) -> Measured:
    label = runs.label

    def total(values: NDArray[Any]) -> FloatArray:
        return np.bincount(label, weights=values, minlength=256).astype(np.float64)

    pixels, interior = total(runs.pixels), total(sums[0])
    # A cluster without any interior is measured on what it has.
    thin = (interior < 1)[label]
    n = np.where(thin, runs.pixels, sums[0])
    grey = np.where(thin, sums[5], sums[1])
    counted = np.maximum(total(n), 1.0)
    raw = total(grey) / counted
    # Take the shading off in grey units, run by run.
    slant = shading * noise.sd(raw)[label]
    flat = grey - n * slant
    mean = total(flat) / counted
    squares = np.where(thin, runs.pixels * raw[label] ** 2, sums[2])
    square = total(squares - 2 * slant * grey + n * slant**2) / counted
    sd = np.sqrt(np.maximum(square - mean**2, 0.0))
    deviation = flat - n * mean[label]
    block = (runs.row // BLOCK) * (shape[1] // BLOCK + 1) + (runs.start + runs.stop) // 2 // BLOCK
    se, scatter = np.zeros(256), np.zeros(256)
    for k in np.flatnonzero(pixels):
        mine = label == k
        by_block = np.bincount(block[mine], weights=deviation[mine])
        blocks = max(int(np.count_nonzero(np.bincount(block[mine], weights=n[mine]))), 1)
        # Few blocks underestimate the scatter; widen as Student's t would.
        widen = np.sqrt(blocks / max(blocks - 1, 1)) * (1 + 2.0 / blocks)
        between = widen * float(np.sqrt(np.sum(by_block**2))) / counted[k] if blocks > 1 else 0.0
        chance = float(noise.sd(mean[k])) * np.sqrt(noise.correlated_pixels / counted[k])
        regional, scatter[k] = _between_regions(table[table["cluster"] == k], mean[k])
        # Borders drawn a little wrong leave an error that no number of pixels averages away.
        fixed = SYSTEMATIC * float(noise.sd(mean[k]))
        se[k] = max(float(np.hypot(max(between, chance, regional), fixed)), 1e-9)
    share = np.maximum(interior, 1.0)
    return Measured(
        pixels,
        interior,
        mean,
        sd,
        se,
        total(sums[3]) / share,
        total(sums[4]) / share,
        scatter,
        table,
        packed,
    )


def _between_regions(table: NDArray[Any], mean: float) -> tuple[float, float]:
    """Standard error of the mean from the regions' scatter, and that scatter beyond the noise."""
    table = table[table["interior_pixels"] >= 12]
    if len(table) < 2:
        return 0.0, 0.0
    weight = table["interior_pixels"] / table["interior_pixels"].sum()
    away = table["grey_mean"] - mean
    effective = 1.0 / float(np.sum(weight**2))
    standard = float(np.sqrt(np.sum(weight**2 * away**2)))
    if effective > 1.2:
        standard *= float(np.sqrt(effective / (effective - 1)))
    excess = float(np.sum(weight * (away**2 - table["grey_se"] ** 2)))
    return standard, float(np.sqrt(max(excess, 0.0)))
