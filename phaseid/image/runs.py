"""Connected regions of a label map, from its runs of equal labels along the rows.

Runs take far less memory than a map of region numbers and are read strip by strip, so that mosaics of
a hundred megapixels need no more than their label map.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

IntArray = NDArray[np.int64]

# Runs are broken at every so many columns, so that what varies slowly is constant along one.
LONGEST = 64


@dataclass(frozen=True, eq=False)
class Runs:
    """Stretches of equal label along the rows, in reading order.

    Attributes
    ----------
    row, start, stop : ndarray of int
        Columns `start` to `stop - 1` of a row.
    label : ndarray of uint8
    """

    row: IntArray
    start: IntArray
    stop: IntArray
    label: NDArray[np.uint8]

    @property
    def pixels(self) -> IntArray:
        """Length of each run."""
        return self.stop - self.start


def runs_of(labels: NDArray[np.uint8], first_row: int = 0) -> tuple[Runs, IntArray]:
    """Find the runs of a strip.

    Parameters
    ----------
    labels : ndarray of uint8, shape (rows, columns)
    first_row : int
        Row of the image the strip begins at.

    Returns
    -------
    runs : Runs
        Of labels other than 0.
    begins : ndarray of int
        Where each run begins in the flattened strip.
    """
    columns = labels.shape[1]
    flat = np.ascontiguousarray(labels).ravel()
    change = np.empty(flat.size, dtype=bool)
    change[0] = True
    np.not_equal(flat[1:], flat[:-1], out=change[1:])
    change.reshape(labels.shape)[:, ::LONGEST] = True
    begins = np.flatnonzero(change)
    ends = np.append(begins[1:], flat.size)
    label = flat[begins]
    keep = label > 0
    begins, ends, label = begins[keep], ends[keep], label[keep]
    row = begins // columns
    return (
        Runs(row + first_row, begins - row * columns, ends - row * columns, label),
        begins,
    )


def joined(parts: list[Runs]) -> Runs:
    """Runs of consecutive strips as one."""
    return Runs(
        np.concatenate([p.row for p in parts]),
        np.concatenate([p.start for p in parts]),
        np.concatenate([p.stop for p in parts]),
        np.concatenate([p.label for p in parts]),
    )


def regions_of(runs: Runs, columns: int) -> tuple[NDArray[np.int32], int]:
    """Number the connected regions (neighbours include diagonal ones).

    Parameters
    ----------
    runs : Runs
    columns : int
        Width of the image.

    Returns
    -------
    region : ndarray of int32, shape (runs,)
        From 0, in reading order of their first pixels.
    count : int
    """
    from scipy.sparse import coo_array
    from scipy.sparse.csgraph import connected_components

    n = len(runs.row)
    if n == 0:
        return np.zeros(0, dtype=np.int32), 0
    width = columns + 2
    begin = runs.row * width + runs.start
    end = runs.row * width + runs.stop
    # Runs of the next row that begin before this one's end (one further for diagonals) and end after
    # its start.
    low = np.searchsorted(end, end - runs.pixels + width, side="left")
    high = np.searchsorted(begin, end + width, side="right")
    number = np.maximum(high - low, 0)
    upper = np.repeat(np.arange(n), number)
    offset = np.arange(number.sum()) - np.repeat(np.cumsum(number) - number, number)
    lower = np.repeat(low, number) + offset
    same = runs.label[upper] == runs.label[lower]
    same &= runs.row[lower] == runs.row[upper] + 1
    # Runs broken at a block of columns go on in the next one.
    beside = np.flatnonzero(
        (runs.row[1:] == runs.row[:-1])
        & (runs.start[1:] == runs.stop[:-1])
        & (runs.label[1:] == runs.label[:-1])
    )
    upper = np.concatenate([upper[same], beside])
    lower = np.concatenate([lower[same], beside + 1])
    graph = coo_array((np.ones(len(upper), dtype=np.int8), (upper, lower)), shape=(n, n))
    count, region = connected_components(graph, directed=False)
    first = np.full(count, n, dtype=np.int64)
    np.minimum.at(first, region, np.arange(n))
    order = np.argsort(first, kind="stable")
    rank = np.empty(count, dtype=np.int32)
    rank[order] = np.arange(count, dtype=np.int32)
    return rank[region], int(count)
