"""Small regions that stand out from what surrounds them, and the phases they belong to.

Whole images are searched, not samples: a phase of 0.02 % of the area in specks of ten pixels has no
visible peak in any histogram, but its pixels lie together.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from phaseid.image.filters import extreme_labels
from phaseid.image.labelling import opened
from phaseid.image.response import Response

FloatImage = NDArray[np.float32]
FloatArray = NDArray[np.float64]

# Standard deviations of the smoothed image: chance gives one pixel in some million independent ones.
SEED = 5.3
REACH = 3.6
STEP = 2
LARGEST = 400
FILL_ROUNDS = 7
BORDER = 4
# Longer than this many widths is a crack or a scratch.
LONGEST = 3.5
LONG_PIXELS = 9.0
MOST_PER_TILE = 400
MOST_BORDER = 0.05
FEWEST_LOCAL = 200
MOST_WEAK = 0.25


@dataclass(frozen=True)
class Speck:
    """One small region.

    Attributes
    ----------
    row, column : int
        Upper left corner of its box, in the image.
    mask : ndarray of bool
        Its pixels within the box.
    matrix : int
        Palette index of what surrounds it.
    flux : float
        Sum of what it adds to the surrounding grey, on the noise axis, with its sign.
    height : float
        The most it adds to the smoothed image, with its sign.
    reach : int
        Pixels over which the flux was summed.
    long : bool
        Crack or scratch rather than a grain.
    length : float
        In pixels, along its long axis.
    texture : float
        Scatter of the surrounding label in this tile, over what noise explains.
    """

    row: int
    column: int
    mask: NDArray[np.bool_]
    matrix: int
    flux: float
    height: float
    reach: int
    long: bool
    length: float
    texture: float

    @property
    def pixels(self) -> int:
        """Pixels of the region."""
        return int(self.mask.sum())


def surroundings(labels: NDArray[np.uint8]) -> tuple[NDArray[np.uint8], NDArray[np.bool_]]:
    """Label of what surrounds each pixel, once everything that holds no 7 x 7 square is taken away.

    Returns
    -------
    around : ndarray of uint8
    small : ndarray of bool
        Pixels that were taken away.
    """
    large = opened(labels, 3)
    around = np.where(large, labels + np.uint8(1), np.uint8(0))
    for _ in range(FILL_ROUNDS):
        if around.all():
            break
        grown = extreme_labels(around, 1)[1]
        np.copyto(around, grown, where=around == 0)
    # What is still empty is finely grown through; its own label stands.
    np.copyto(around, labels + np.uint8(1), where=around == 0)
    return around - np.uint8(1), ~large


def find_specks(
    levels: list[FloatImage],
    around: NDArray[np.uint8],
    position: FloatArray,
    response: Response,
    inner: tuple[slice, slice],
    origin: tuple[int, int],
    shape: tuple[int, int],
    left_out: NDArray[np.bool_] | None,
) -> list[Speck]:
    """Find the specks of one tile.

    Parameters
    ----------
    levels : list of ndarray
        Greys on the noise axis, smoothed 0, 1, 2, ... times.
    around : ndarray of uint8
        As from `surroundings`.
    position : ndarray
        Of the labels on the noise axis.
    response : Response
    inner : (slice, slice)
        Specks whose brightest pixel lies elsewhere belong to the neighbouring tile.
    origin : (int, int)
        Of the inner part, in the image.
    shape : (int, int)
        Of the image; what its frame cuts is no speck, for nothing tells what it is part of.
    left_out : ndarray of bool or None

    Returns
    -------
    list of Speck
    """
    from scipy import ndimage

    low, high = extreme_labels(around, BORDER)
    plain = low == high
    centre, spread = _local(levels[STEP], around, plain, position, float(response.level[STEP]))
    matrix = centre[around]
    excess = levels[STEP] - matrix
    sd = spread[around]
    strong = np.abs(excess) > SEED * sd
    strong &= plain
    if left_out is not None:
        strong &= ~left_out
    if not strong.any():
        return []
    # Right at a border everything stands out; only what lies clear of it can be a speck.
    weak = (np.abs(excess) > REACH * sd) & np.equal(*extreme_labels(around, BORDER - 1))
    if weak.mean() > MOST_WEAK:
        return []
    numbered, count = ndimage.label(weak, structure=np.ones((3, 3), bool))
    # What reaches into the blurred zone along a border is part of that border.
    mixed = ~plain
    size = np.bincount(numbered.ravel(), minlength=count + 1)
    at_border = np.bincount(numbered[mixed], minlength=count + 1)
    hit = np.unique(numbered[strong])
    hit = hit[at_border[hit] <= MOST_BORDER * size[hit]]
    hit = hit[hit > 0][:MOST_PER_TILE]
    boxes = ndimage.find_objects(numbered)
    found: list[Speck] = []
    texture = spread / response.level[STEP]
    fine = levels[0] - matrix
    for number in hit:
        speck = _describe(
            numbered, int(number), boxes[number - 1], excess, fine, around, inner, origin, texture
        )
        if speck is not None and _inside(speck, shape):
            found.append(speck)
    return found


def _local(
    level: FloatImage,
    around: NDArray[np.uint8],
    plain: NDArray[np.bool_],
    position: FloatArray,
    noise_sd: float,
) -> tuple[FloatImage, FloatImage]:
    """Grey and scatter of each label in this tile: texture and drift raise the bar for specks."""
    centre = position.astype(np.float32)
    spread = np.full(len(position), noise_sd, dtype=np.float32)
    thin = (slice(None, None, 3), slice(None, None, 3))
    chosen = plain[thin]
    labels, values = around[thin][chosen], level[thin][chosen]
    for k in np.flatnonzero(np.bincount(labels, minlength=len(position)) >= FEWEST_LOCAL):
        mine = values[labels == k]
        middle = np.median(mine)
        centre[k] = middle
        spread[k] = max(noise_sd, 1.4826 * float(np.median(np.abs(mine - middle))))
    return centre, spread


def _describe(
    numbered: NDArray[np.int32],
    number: int,
    box: tuple[slice, slice],
    excess: FloatImage,
    fine: FloatImage,
    around: NDArray[np.uint8],
    inner: tuple[slice, slice],
    origin: tuple[int, int],
    texture: FloatImage,
) -> Speck | None:
    inside = numbered[box] == number
    pixels = int(inside.sum())
    long = _is_long(inside)
    if pixels > LARGEST and not long:
        return None
    local = np.where(inside, np.abs(excess[box]), 0.0)
    peak = np.unravel_index(int(np.argmax(local)), local.shape)
    at = (int(peak[0]) + box[0].start, int(peak[1]) + box[1].start)
    if not all(s.start <= p < s.stop for s, p in zip(inner, at, strict=True)):
        return None
    matrix = int(around[at])
    sign = 1.0 if excess[at] > 0 else -1.0
    grown = _grown_box(box, 3, numbered.shape)
    values = sign * fine[grown].astype(float)
    near = _near(numbered[grown] == number, 2)
    flux = float(values[near].sum())
    height = float(sign * excess[at])
    # The region proper: above half its own height.
    core = (sign * excess[box] > 0.5 * height) & inside
    return Speck(
        box[0].start - inner[0].start + origin[0],
        box[1].start - inner[1].start + origin[1],
        core,
        matrix,
        sign * flux,
        sign * height,
        int(near.sum()),
        long,
        4.0 * _axes(inside)[0],
        float(texture[matrix]),
    )


def _inside(speck: Speck, shape: tuple[int, int]) -> bool:
    if speck.long:
        return True
    ends = (speck.row + speck.mask.shape[0], speck.column + speck.mask.shape[1])
    starts = (speck.row, speck.column)
    return all(a >= 1 and b <= n - 1 for a, b, n in zip(starts, ends, shape, strict=True))


def _grown_box(box: tuple[slice, slice], by: int, shape: tuple[int, ...]) -> tuple[slice, slice]:
    return (
        slice(max(0, box[0].start - by), min(shape[0], box[0].stop + by)),
        slice(max(0, box[1].start - by), min(shape[1], box[1].stop + by)),
    )


def _near(mask: NDArray[np.bool_], reach: int) -> NDArray[np.bool_]:
    return np.asarray(extreme_labels(mask.astype(np.uint8), reach)[1] > 0)


def _axes(mask: NDArray[np.bool_]) -> tuple[float, float]:
    """Standard deviations along the long and the short axis."""
    y, x = np.nonzero(mask)
    if len(y) < 3:
        return 0.5, 0.5
    covariance = np.cov(np.stack([y, x]).astype(float)) + np.eye(2) / 12
    small, large = np.linalg.eigvalsh(covariance)
    return float(np.sqrt(large)), float(np.sqrt(max(small, 1e-9)))


def _is_long(mask: NDArray[np.bool_]) -> bool:
    large, small = _axes(mask)
    pixels = int(mask.sum())
    # A winding crack fills little of its box; a straight one is long for its width.
    spread = 4 * large
    return spread > LONG_PIXELS and (
        large > LONGEST * small or pixels < 0.35 * np.pi / 4 * (4 * large) * (4 * small)
    )
