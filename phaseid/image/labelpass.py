"""The pass that labels every pixel and gathers what the labels must be judged by."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from phaseid.image.canvas import Canvas, Tile, in_parallel
from phaseid.image.filters import extreme_labels, pyramid
from phaseid.image.labelling import Palette, label_tile
from phaseid.image.response import Response
from phaseid.image.specks import Speck, find_specks, surroundings

FloatArray = NDArray[np.float64]

# Greys on either side of a border are compared this many pixels from it.
HALF_GAP = 4


@dataclass(eq=False)
class Evidence:
    """What was seen at the borders and inside of the labels, summed over the image.

    Attributes
    ----------
    pixels, core, rim, small : ndarray of shape (labels,)
        Pixels of each label; those in a uniform 5 x 5 square; those between a darker and a brighter
        label; those where no 7 x 7 square of the label fits.
    step, contacts : ndarray of shape (labels, labels)
        Sum of the grey steps across borders (from the row's label to the column's), and their number.
    sharp, sharp_contacts : ndarray of shape (labels, labels)
        The same over one pixel, for the width of the borders.
    specks : list of Speck
    """

    pixels: FloatArray
    core: FloatArray
    rim: FloatArray
    small: FloatArray
    step: FloatArray
    contacts: FloatArray
    sharp: FloatArray
    sharp_contacts: FloatArray
    specks: list[Speck] = field(default_factory=list)

    @classmethod
    def empty(cls, labels: int) -> Evidence:
        """Nothing seen yet."""
        one = [np.zeros(labels) for _ in range(4)]
        two = [np.zeros((labels, labels)) for _ in range(4)]
        return cls(one[0], one[1], one[2], one[3], two[0], two[1], two[2], two[3])

    def add(self, other: Evidence) -> None:
        """Add what was seen elsewhere."""
        for name in (
            "pixels",
            "core",
            "rim",
            "small",
            "step",
            "contacts",
            "sharp",
            "sharp_contacts",
        ):
            getattr(self, name).__iadd__(getattr(other, name))
        self.specks.extend(other.specks)


def label_image(
    canvas: Canvas,
    response: Response,
    palette: Palette,
    labels: NDArray[np.uint8],
    tiles: Sequence[Tile] | None = None,
    progress: Callable[[float], None] | None = None,
) -> Evidence:
    """Label an image.

    Parameters
    ----------
    canvas : Canvas
    response : Response
    palette : Palette
    labels : ndarray of uint8
        Written: index into the palette plus one; 0 where left out.
    tiles : sequence of Tile, optional
        Only these.
    progress : callable, optional

    Returns
    -------
    Evidence
    """
    table = canvas.axis.table(canvas.data.dtype)
    chosen = list(canvas.tiles() if tiles is None else tiles)
    total = Evidence.empty(len(palette.position))

    def work(tile: Tile) -> tuple[Tile, NDArray[np.uint8], Evidence]:
        levels = pyramid(canvas.greys(tile, table), 2)
        found = label_tile(levels, palette)
        evidence = _gather(canvas, tile, levels, found, palette, response)
        return tile, found[tile.inner], evidence

    for n, (tile, found, evidence) in enumerate(in_parallel(work, chosen)):
        labels[tile.rows, tile.columns] = found + np.uint8(1)
        total.add(evidence)
        if progress is not None:
            progress((n + 1) / len(chosen))
    if canvas.outside is not None:
        labels[canvas.outside] = 0
    return total


def _gather(
    canvas: Canvas,
    tile: Tile,
    levels: list[NDArray[np.float32]],
    labels: NDArray[np.uint8],
    palette: Palette,
    response: Response,
) -> Evidence:
    number = len(palette.position)
    found = Evidence.empty(number)
    out = canvas.left_out(tile)
    around, small = surroundings(labels)
    core = np.equal(*extreme_labels(labels, 2))
    low, high = extreme_labels(labels, 3)
    rim = (low < labels) & (labels < high)
    inner = labels[tile.inner]
    valid = np.ones(inner.shape, bool) if out is None else ~out[tile.inner]
    found.pixels = _count(inner[valid], number)
    found.core = _count(inner[valid & core[tile.inner]], number)
    found.rim = _count(inner[valid & rim[tile.inner]], number)
    found.small = _count(inner[valid & small[tile.inner]], number)
    if out is not None:
        core = core & ~out
    if number > 1:
        for axis in (0, 1):
            _borders(found, levels, labels, core, axis, number)
    found.specks = find_specks(
        levels,
        around,
        palette.position,
        response,
        tile.inner,
        (tile.rows.start, tile.columns.start),
        (canvas.data.shape[0], canvas.data.shape[1]),
        out,
    )
    return found


def _count(labels: NDArray[np.uint8], number: int) -> FloatArray:
    return np.bincount(labels.ravel(), minlength=number).astype(float)


def _borders(
    found: Evidence,
    levels: list[NDArray[np.float32]],
    labels: NDArray[np.uint8],
    core: NDArray[np.bool_],
    axis: int,
    number: int,
) -> None:
    """Steps between label changes of neighbouring pixels along one axis."""
    size = labels.shape[axis]

    def at(array: NDArray, shift: int) -> NDArray:  # type: ignore[type-arg]
        part = slice(HALF_GAP + shift, size - HALF_GAP - 1 + shift)
        return array[part] if axis == 0 else array[:, part]

    change = at(labels, 0) != at(labels, 1)
    index = np.flatnonzero(change)
    if not len(index):
        return
    before, after = (at(labels, s).ravel()[index] for s in (-HALF_GAP, HALF_GAP + 1))
    clear = (
        (before != after)
        & at(core, -HALF_GAP).ravel()[index]
        & at(core, HALF_GAP + 1).ravel()[index]
    )
    index, before, after = index[clear], before[clear], after[clear]
    pair = before.astype(np.intp) * number + after
    far = at(levels[1], HALF_GAP + 1).ravel()[index] - at(levels[1], -HALF_GAP).ravel()[index]
    near = at(levels[0], 1).ravel()[index] - at(levels[0], 0).ravel()[index]
    shape = (number, number)
    found.step += np.bincount(pair, far, minlength=number**2).reshape(shape)
    found.contacts += np.bincount(pair, minlength=number**2).reshape(shape)
    found.sharp += np.bincount(pair, near, minlength=number**2).reshape(shape)
    found.sharp_contacts += np.bincount(pair, minlength=number**2).reshape(shape)
