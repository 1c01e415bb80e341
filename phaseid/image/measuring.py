"""From a label map to clusters and regions with their greys and honest standard errors."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from phaseid.image.clusters import REGION_FIELDS
from phaseid.image.filters import extreme_labels
from phaseid.image.label_sums import BLOCK, LabelSums
from phaseid.image.noise import NoiseLaw
from phaseid.image.region_sums import RegionSums, RunSums
from phaseid.image.runs import Runs, runs_of
from phaseid.image.shading import Shading

FloatArray = NDArray[np.float64]

# Rows at a time; a multiple of the block of `label_sums`.
STRIP = 256
# Pixels nearer to another label than this many standard deviations of the blur are blends.
EDGE_BLURS = 2.5
EDGE_LIMITS = (2, 6)
# Above this share of cut-off pixels a mean is only a bound (common practice: about one per cent).
CLIPPED_SHARE = 0.01
SMALLEST_REGION = 12


@dataclass(frozen=True, eq=False)
class Measured:
    """Clusters by label, and the region table.

    Attributes
    ----------
    pixels, interior, mean, sd, se, low, high : ndarray of shape (256,)
        By label: pixels, interior pixels, mean and standard deviation of the interior, standard error of
        the mean, share of interior pixels at the lower and upper end of the range.
    scatter : ndarray of shape (256,)
        Standard deviation of the greys of regions beyond what the noise explains.
    regions : ndarray of REGION_FIELDS
    edge : ndarray of uint8
        Packed bits, row by row.
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
    by_label, by_region = LabelSums(), RegionSums(columns)
    for first in range(0, rows, STRIP):
        last = min(first + STRIP, rows)
        edge = _edges(labels, first, last, reach)
        if muted is not None:
            edge[_muted_rows(muted, offset, first, last)] = True
        packed[first:last] = np.packbits(edge, axis=1)
        runs, begins = runs_of(labels[first:last], first)
        sums = _along_runs(data[first:last], edge, begins, runs, shading, offset)
        by_label.add(runs, sums, columns // BLOCK + 1)
        _add_pixels(by_label, data[first:last], labels[first:last], edge, ends)
        by_region.add(runs, sums, first, last - 1)
        if progress is not None:
            progress(last / rows)
    table = _table(by_region, noise, pixel_size_nm, data.shape)
    return _measured(by_label, table, noise, packed)


def _muted_rows(muted: NDArray[np.bool_], offset: int, first: int, last: int) -> NDArray[np.bool_]:
    at = np.arange(first, last) - offset
    inside = (at >= 0) & (at < len(muted))
    return np.where(inside, muted[np.clip(at, 0, len(muted) - 1)], False)


def _edges(labels: NDArray[np.uint8], first: int, last: int, reach: int) -> NDArray[np.bool_]:
    top, bottom = max(0, first - reach), min(labels.shape[0], last + reach)
    low, high = extreme_labels(labels[top:bottom], reach)
    inner = slice(first - top, first - top + last - first)
    return np.asarray((low != high)[inner])


def _along_runs(
    data: NDArray[Any],
    edge: NDArray[np.bool_],
    begins: NDArray[np.int64],
    runs: Runs,
    shading: Shading,
    offset: int,
) -> RunSums:
    if not len(begins):
        return RunSums(*(np.zeros(0) for _ in range(4)))
    # Gaps (label 0) lie between runs: sum up to the end of each run only.
    cuts = np.stack([begins, begins + runs.pixels], axis=1).ravel()
    inside = ~edge.ravel()
    grey = data.ravel().astype(np.float64)
    every = _reduced(grey, cuts)
    grey *= inside
    shade = np.zeros(len(begins))
    if not shading.none:
        shade = shading.at(runs.row - offset, (runs.start + runs.stop - 1) / 2)
    return RunSums(_reduced(inside, cuts), _reduced(grey, cuts), every, shade)


def _reduced(values: NDArray[Any], cuts: NDArray[np.int64]) -> FloatArray:
    # reduceat needs every index inside; the last run may end at the very end.
    padded = np.append(values, values[-1:] * 0) if cuts[-1] == len(values) else values
    return np.asarray(np.add.reduceat(padded, cuts, dtype=np.float64)[::2])


def _add_pixels(
    sums: LabelSums,
    data: NDArray[Any],
    labels: NDArray[np.uint8],
    edge: NDArray[np.bool_],
    ends: tuple[float | None, float | None],
) -> None:
    """What needs single pixels: squares, and those at the ends of the range."""
    inner = ~edge & (labels > 0)
    chosen, grey = labels[inner], data[inner].astype(np.float64)
    sums.square += np.bincount(chosen, weights=grey * grey, minlength=256)
    low, high = ends
    if low is not None:
        sums.low += np.bincount(chosen[grey <= low], minlength=256)
    if high is not None:
        sums.high += np.bincount(chosen[grey >= high], minlength=256)


def _table(
    regions: RegionSums, noise: NoiseLaw, pixel_size_nm: float | None, shape: tuple[int, ...]
) -> NDArray[Any]:
    sums, boxes, label = regions.joined()
    table = np.zeros(len(label), REGION_FIELDS)
    if not len(label):
        return table
    pixels, interior = sums["pixels"], sums["interior"]
    row, column = sums["row"] / pixels, sums["column"] / pixels
    down = sums["row_row"] / pixels - row**2 + 1 / 12
    across = sums["column_column"] / pixels - column**2 + 1 / 12
    both = sums["row_column"] / pixels - row * column
    root = np.sqrt((across - down) ** 2 / 4 + both**2)
    large, small = (across + down) / 2 + root, (across + down) / 2 - root
    enough = interior > 0
    n = np.where(enough, interior, pixels)
    grey = np.where(enough, sums["grey_interior"], sums["grey_all"]) / n
    tilt = np.where(enough, sums["shade_interior"], sums["shade_all"]) / n
    size_um = np.nan if pixel_size_nm is None else pixel_size_nm / 1000
    table["region"] = np.arange(1, len(label) + 1)
    table["cluster"] = label
    table["pixels"], table["interior_pixels"] = pixels, interior
    table["row"], table["column"] = row, column
    table["equivalent_diameter_px"] = np.sqrt(4 * pixels / np.pi)
    table["equivalent_diameter_um"] = table["equivalent_diameter_px"] * size_um
    table["area_um2"] = pixels * size_um**2
    table["grey_mean"] = grey - tilt * noise.sd(grey)
    effective = np.maximum(n / noise.correlated_pixels, 1.0)
    table["grey_se"] = np.sqrt(noise.variance(grey) / effective)
    table["edge_share"] = 1.0 - interior / pixels
    table["elongation"] = np.sqrt(np.maximum(large, 1 / 12) / np.maximum(small, 1 / 12))
    table["angle_deg"] = np.degrees(0.5 * np.arctan2(2 * both, across - down))
    table["first_row"], table["first_column"] = boxes[:, 0], boxes[:, 2]
    table["height"] = boxes[:, 1] - boxes[:, 0]
    table["width"] = boxes[:, 3] - boxes[:, 2]
    table["touches_frame"] = (
        (boxes[:, 0] <= boxes[:, 0].min())
        | (boxes[:, 1] >= boxes[:, 1].max())
        | (boxes[:, 2] == 0)
        | (boxes[:, 3] == shape[1])
    )
    return table


def _measured(
    sums: LabelSums, table: NDArray[Any], noise: NoiseLaw, packed: NDArray[np.uint8]
) -> Measured:
    mean, sd = sums.means(noise)
    se = sums.errors(noise)
    scatter = np.zeros(256)
    for k in np.flatnonzero(sums.pixels):
        regional, scatter[k] = _between_regions(table[table["cluster"] == k], float(mean[k]))
        se[k] = max(se[k], regional, 1e-9)
    share = np.maximum(sums.interior, 1.0)
    return Measured(
        sums.pixels,
        sums.interior,
        mean,
        sd,
        se,
        sums.low / share,
        sums.high / share,
        scatter,
        table,
        packed,
    )


def _between_regions(table: NDArray[Any], mean: float) -> tuple[float, float]:
    """Standard error of the mean from the regions' scatter, and that scatter beyond the noise."""
    table = table[table["interior_pixels"] >= SMALLEST_REGION]
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
