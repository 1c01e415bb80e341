"""Sums over the connected regions of strips, joined across their seams.

Nothing but one strip's runs and one row of sums per region is ever held, however large the image.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from phaseid.image.runs import Runs, regions_of

FloatArray = NDArray[np.float64]

# What is summed per region.
ADDED = (
    "pixels", "interior", "grey_interior", "grey_all", "shade_interior", "shade_all",
    "row", "column", "row_row", "column_column", "row_column",
)  # fmt: skip


@dataclass(frozen=True, eq=False)
class RunSums:
    """Sums along each run of a strip.

    Attributes
    ----------
    interior, grey_interior, grey_all : ndarray of shape (runs,)
        Interior pixels, sum of their greys, sum of all greys.
    shade : ndarray of shape (runs,)
        Shading at the middle of the run, in units of the noise.
    """

    interior: FloatArray
    grey_interior: FloatArray
    grey_all: FloatArray
    shade: FloatArray


class RegionSums:
    """Collects regions strip by strip.

    Parameters
    ----------
    columns : int
        Width of the image.
    """

    def __init__(self, columns: int) -> None:
        self._columns = columns
        self._sums: list[FloatArray] = []
        self._boxes: list[NDArray[np.int64]] = []
        self._labels: list[NDArray[np.uint8]] = []
        self._seams: list[NDArray[np.int64]] = []
        self._count = 0
        self._last: tuple[Runs, NDArray[np.int64]] | None = None

    def add(self, runs: Runs, sums: RunSums, first_row: int, last_row: int) -> None:
        """Add a strip of rows `first_row` to `last_row`."""
        region, count = regions_of(runs, self._columns)
        self._sums.append(_summed(runs, sums, region, count))
        self._boxes.append(_boxes(runs, region, count))
        label = np.zeros(count, dtype=np.uint8)
        label[region] = runs.label
        self._labels.append(label)
        number = region.astype(np.int64) + self._count
        if self._last is not None:
            top = runs.row == first_row
            self._seams.append(_touching(*self._last, _rows(runs, top), number[top]))
        bottom = runs.row == last_row
        self._last = (_rows(runs, bottom), number[bottom])
        self._count += count

    def joined(self) -> tuple[dict[str, FloatArray], NDArray[np.int64], NDArray[np.uint8]]:
        """Regions of the whole image.

        Returns
        -------
        sums : dict
            By the names of `ADDED`, each of shape (regions,).
        boxes : ndarray of shape (regions, 4)
            First row, end row, first column, end column.
        label : ndarray of uint8
        """
        from scipy.sparse import coo_array
        from scipy.sparse.csgraph import connected_components

        if self._count == 0:
            return (
                {n: np.zeros(0) for n in ADDED},
                np.zeros((0, 4), np.int64),
                np.zeros(0, np.uint8),
            )
        seams = np.concatenate(self._seams) if self._seams else np.zeros((0, 2), np.int64)
        links = np.ones(len(seams), dtype=np.int8)
        graph = coo_array((links, (seams[:, 0], seams[:, 1])), shape=(self._count, self._count))
        count, region = connected_components(graph, directed=False)
        # In reading order of the regions' first parts.
        _, first = np.unique(region, return_index=True)
        rank = np.empty(count, dtype=np.int64)
        rank[np.argsort(first, kind="stable")] = np.arange(count)
        region = rank[region]
        parts = np.concatenate(self._sums)
        sums = {
            name: np.bincount(region, weights=parts[:, n], minlength=count).astype(np.float64)
            for n, name in enumerate(ADDED)
        }
        boxes = np.empty((count, 4), dtype=np.int64)
        boxes[:, [0, 2]] = np.iinfo(np.int64).max
        boxes[:, [1, 3]] = 0
        every = np.concatenate(self._boxes)
        for n in (0, 2):
            np.minimum.at(boxes[:, n], region, every[:, n])
        for n in (1, 3):
            np.maximum.at(boxes[:, n], region, every[:, n])
        label = np.zeros(count, dtype=np.uint8)
        label[region] = np.concatenate(self._labels)
        return sums, boxes, label


def _summed(runs: Runs, sums: RunSums, region: NDArray[np.int32], count: int) -> FloatArray:
    n = runs.pixels.astype(float)
    row = runs.row.astype(float)
    middle = (runs.start + runs.stop - 1) / 2
    values = (
        n,
        sums.interior,
        sums.grey_interior,
        sums.grey_all,
        sums.interior * sums.shade,
        n * sums.shade,
        n * row,
        n * middle,
        n * row * row,
        # Sum of squared columns along a run, in closed form.
        n * middle * middle + n * (n * n - 1) / 12,
        n * row * middle,
    )
    return np.stack(
        [np.bincount(region, weights=v, minlength=count) for v in values], axis=1
    ).astype(np.float64)


def _boxes(runs: Runs, region: NDArray[np.int32], count: int) -> NDArray[np.int64]:
    boxes = np.empty((count, 4), dtype=np.int64)
    boxes[:, [0, 2]] = np.iinfo(np.int64).max
    boxes[:, [1, 3]] = 0
    np.minimum.at(boxes[:, 0], region, runs.row)
    np.maximum.at(boxes[:, 1], region, runs.row + 1)
    np.minimum.at(boxes[:, 2], region, runs.start)
    np.maximum.at(boxes[:, 3], region, runs.stop)
    return boxes


def _rows(runs: Runs, chosen: NDArray[np.bool_]) -> Runs:
    return Runs(runs.row[chosen], runs.start[chosen], runs.stop[chosen], runs.label[chosen])


def _touching(
    above: Runs, upper: NDArray[np.int64], below: Runs, lower: NDArray[np.int64]
) -> NDArray[np.int64]:
    """Pairs of regions that meet across a seam, diagonals included."""
    low = np.searchsorted(below.stop, above.start, side="left")
    high = np.searchsorted(below.start, above.stop, side="right")
    number = np.maximum(high - low, 0)
    a = np.repeat(np.arange(len(above.row)), number)
    b = (
        np.repeat(low, number)
        + np.arange(number.sum())
        - np.repeat(np.cumsum(number) - number, number)
    )
    same = above.label[a] == below.label[b]
    return np.stack([upper[a[same]], lower[b[same]]], axis=1)
