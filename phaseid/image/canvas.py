"""Passing over an image in tiles with overlap, on both cores, interruptible."""

from __future__ import annotations

import itertools
import os
from collections.abc import Callable, Iterable, Iterator
from concurrent.futures import FIRST_COMPLETED, Future, ThreadPoolExecutor, wait
from dataclasses import dataclass
from typing import Any, TypeVar

import numpy as np
from numpy.typing import NDArray

from phaseid.image.shading import Shading
from phaseid.image.stabilise import NoiseAxis

FloatImage = NDArray[np.float32]
Result = TypeVar("Result")

TILE = 480
MARGIN = 32


@dataclass(frozen=True)
class Tile:
    """A block of the image and where its inner part lies.

    Attributes
    ----------
    rows, columns : slice
        Inner part, in the image.
    inner : (slice, slice)
        Inner part, in the tile's arrays.
    number : int
    """

    rows: slice
    columns: slice
    inner: tuple[slice, slice]
    number: int


@dataclass(frozen=True, eq=False)
class Canvas:
    """What the passes work on: raw greys, the noise axis, the shading and what is left out.

    Attributes
    ----------
    data : ndarray of shape (rows, columns)
        Without the bar.
    axis : NoiseAxis
    shading : Shading
    outside : ndarray of bool or None
        Pixels left out.
    muted : ndarray of bool, shape (rows,), or None
        Rows that are labelled but tell nothing about the phases, such as charging bands.
    """

    data: NDArray[Any]
    axis: NoiseAxis
    shading: Shading
    outside: NDArray[np.bool_] | None = None
    muted: NDArray[np.bool_] | None = None

    def tiles(self) -> list[Tile]:
        """Tiles of about 480 pixels that cover the image."""
        rows, columns = self.data.shape
        starts = [_cuts(n) for n in (rows, columns)]
        tiles: list[Tile] = []
        for r0, r1 in starts[0]:
            for c0, c1 in starts[1]:
                inner = (slice(MARGIN, MARGIN + r1 - r0), slice(MARGIN, MARGIN + c1 - c0))
                tiles.append(Tile(slice(r0, r1), slice(c0, c1), inner, len(tiles)))
        return tiles

    def raw(self, tile: Tile) -> NDArray[Any]:
        """Greys of a tile with its margin, mirrored at the frame."""
        return self.around(self.data, tile)

    def greys(self, tile: Tile, table: FloatImage | None) -> FloatImage:
        """Positions on the noise axis, shading taken off, of a tile with its margin."""
        raw = self.raw(tile)
        z = self.axis.forward(raw).astype(np.float32) if table is None else table[raw]
        if not self.shading.none:
            top, left = tile.inner[0].start, tile.inner[1].start
            z -= self.shading.over(
                tile.rows.start - top, raw.shape[0], tile.columns.start - left, raw.shape[1]
            )
        return z

    def left_out(self, tile: Tile) -> NDArray[np.bool_] | None:
        """Pixels left out of a tile with its margin; None if there are none."""
        out = None
        if self.outside is not None:
            out = self.around(self.outside, tile)
        if self.muted is not None:
            shape = (self.data.shape[0], self.data.shape[1])
            rows = self.around(np.broadcast_to(self.muted[:, None], shape), tile)
            out = rows if out is None else out | rows
        return out if out is not None and out.any() else None

    def around(self, array: NDArray[Any], tile: Tile) -> NDArray[Any]:
        """A tile of any image of the same shape, with margin."""
        rows, columns = array.shape
        top, left = tile.inner[0].start, tile.inner[1].start
        r0, r1 = tile.rows.start - top, tile.rows.stop + top
        c0, c1 = tile.columns.start - left, tile.columns.stop + left
        part = array[max(r0, 0) : min(r1, rows), max(c0, 0) : min(c1, columns)]
        pad = [(max(-r0, 0), max(r1 - rows, 0)), (max(-c0, 0), max(c1 - columns, 0))]
        if any(p for pair in pad for p in pair):
            part = np.pad(part, pad, mode="reflect")
        return part


def _cuts(length: int) -> list[tuple[int, int]]:
    number = max(1, round(length / TILE))
    edges = np.linspace(0, length, number + 1).astype(int)
    return [(int(a), int(b)) for a, b in itertools.pairwise(edges)]


def in_parallel(work: Callable[[Tile], Result], tiles: Iterable[Tile]) -> Iterator[Result]:
    """Results of `work` in the order of the tiles, computed on all cores.

    Only a few tiles are under way at a time, so that neither memory nor the wait after an interruption
    grows with the image.
    """
    todo = list(tiles)
    workers = min(os.cpu_count() or 1, len(todo))
    if workers < 2:
        yield from map(work, todo)
        return
    pool = ThreadPoolExecutor(workers)
    waiting: dict[int, Future[Result]] = {}
    started = 0
    try:
        for n in range(len(todo)):
            while started < len(todo) and started < n + 2 * workers:
                waiting[started] = pool.submit(work, todo[started])
                started += 1
            wait([waiting[n]], return_when=FIRST_COMPLETED)
            yield waiting.pop(n).result()
    finally:
        pool.shutdown(wait=True, cancel_futures=True)
