"""Giving every pixel a label: nearest grey where that is clear, neighbours where it is not.

The energy is the usual one (squared distance to the label's grey, plus a price on borders that grows with
the step across them); it is lowered by convolution and thresholding, the scheme of Merriman, Bence & Osher
(1994) with the surface tensions of Esedoglu & Otto (2015): a few small filters per label, no search.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from phaseid.image.filters import extreme_labels, gathered

FloatImage = NDArray[np.float32]
FloatArray = NDArray[np.float64]

# (smoothing steps of the neighbourhood, price factor, rounds), from far-sighted to near-sighted.
STAGES = ((3, 1.0, 3), (2, 2.0, 2))
LAST_STAGE = ((2, 1.0, 2),)
# The price of a border of unit length grows slowly with the step across it, so that a rim of a third
# grey between two phases costs more than the plain border.
PRICE = 1.6
PRICE_POWER = 0.25
LARGEST_STEP = 4.0
# From this step on, for labels no wider than that, the far-sighted stages change nothing.
EASY_STEP = 2.5
EASY_VARIANCE = 1.5
# Below this step the last stage looks at the wider average.
SMALL_STEP = 1.3
# Borders with a step smaller than this many noises are drawn roughly: rims up to four pixels wide occur.
FAINT_STEP = 6.0
STILL = 2e-4


@dataclass(frozen=True, eq=False)
class Palette:
    """Greys that pixels can take, on the noise axis scaled to independent pixels.

    Attributes
    ----------
    position : ndarray of shape (labels,)
        Ascending.
    variance : ndarray of shape (labels,)
        Of a pixel around it, in units of the noise.
    scale : float
        Standard deviations of the pixel noise per unit of independent information.
    """

    position: FloatArray
    variance: FloatArray
    scale: float = 1.0

    def tensions(self) -> FloatArray:
        """Price of a border of unit length between two labels, shape (labels, labels)."""
        step = np.abs(self.position[:, None] - self.position) / self.scale
        step /= np.sqrt(0.5 * (self.variance[:, None] + self.variance))
        return np.asarray(PRICE * np.minimum(step, LARGEST_STEP) ** PRICE_POWER)


def label_tile(levels: list[FloatImage], palette: Palette) -> NDArray[np.uint8]:
    """Label one tile.

    Parameters
    ----------
    levels : list of ndarray
        The greys on the noise axis and their smoothed versions after 1, 2, ... steps.
    palette : Palette

    Returns
    -------
    ndarray of uint8
        Index into the palette, from 0.
    """
    labels = nearest(levels[2], palette)
    present = np.flatnonzero(np.bincount(labels.ravel(), minlength=len(palette.position)))
    if len(present) == 1:
        return labels
    local = Palette(palette.position[present], palette.variance[present], palette.scale)
    renumber = np.zeros(256, dtype=np.uint8)
    renumber[present] = np.arange(len(present))
    least = float(np.diff(local.position).min()) / local.scale
    easy = least >= EASY_STEP and float(local.variance.max()) < EASY_VARIANCE
    if easy:
        # So far apart that the finest average tells them: only single pixels are left to clean up.
        chosen = nearest(levels[1], local)
    else:
        chosen = _relax(levels[1], renumber[labels], local, STAGES)
    chosen = without_rims(chosen, levels[1], local)
    wide = least <= SMALL_STEP
    chosen = _relax(levels[2 if wide else 1], chosen, local, LAST_STAGE)
    chosen = without_rims(chosen, levels[1], local)
    return present.astype(np.uint8)[chosen]


def nearest(level: FloatImage, palette: Palette) -> NDArray[np.uint8]:
    """Label whose grey explains each pixel best."""
    if len(palette.position) == 1:
        return np.zeros(level.shape, dtype=np.uint8)
    return _cheapest([_cost(level, palette, k) for k in range(len(palette.position))])


def _cost(level: FloatImage, palette: Palette, k: int) -> FloatImage:
    cost = level - np.float32(palette.position[k])
    cost *= cost
    cost *= np.float32(0.5 / (palette.variance[k] * palette.scale**2))
    cost += np.float32(0.5 * np.log(palette.variance[k]))
    return cost


def _cheapest(costs: list[FloatImage]) -> NDArray[np.uint8]:
    best = costs[0].copy()
    labels = np.zeros(best.shape, dtype=np.uint8)
    for k, cost in enumerate(costs[1:], start=1):
        better = cost < best
        labels[better] = k
        np.minimum(best, cost, out=best)
    return labels


def _relax(
    level: FloatImage,
    labels: NDArray[np.uint8],
    palette: Palette,
    stages: tuple[tuple[int, float, int], ...],
) -> NDArray[np.uint8]:
    number = len(palette.position)
    data = [_cost(level, palette, k) for k in range(number)]
    tension = palette.tensions().astype(np.float32)
    product, cost = np.empty_like(level), np.empty_like(level)
    for steps, factor, rounds in stages:
        for _ in range(rounds):
            around = _shares(labels, number, steps)
            best = np.full_like(level, np.inf)
            changed = np.zeros_like(labels)
            for i in range(number):
                np.copyto(cost, data[i])
                for j in range(number):
                    if i != j:
                        np.multiply(around[j], np.float32(factor) * tension[i, j], out=product)
                        cost += product
                np.putmask(changed, cost < best, np.uint8(i))
                np.minimum(best, cost, out=best)
            moved = np.count_nonzero(changed != labels)
            labels = changed
            if moved < STILL * labels.size:
                break
    return labels


def _shares(labels: NDArray[np.uint8], number: int, steps: int) -> list[FloatImage]:
    """Share of each label in the neighbourhood of each pixel; together they are one."""
    scale = np.float32(1.0 / 16**steps)
    shares: list[FloatImage] = []
    rest = np.ones(labels.shape, dtype=np.float32)
    for k in range(number - 1):
        # Integers of 16 bits hold up to three steps exactly and take half the memory of floats.
        count = (labels == k).astype(np.uint16)
        for step in range(steps):
            count = gathered(count, 2**step)
        share = count.astype(np.float32)
        share *= scale
        rest -= share
        shares.append(share)
    shares.append(rest)
    return shares


def without_rims(
    labels: NDArray[np.uint8], level: FloatImage, palette: Palette, rounds: int = 2
) -> NDArray[np.uint8]:
    """Hand thin rims between a darker and a brighter label to their neighbours.

    A blurred border between two phases passes through every grey between them; where a label appears only
    as such a rim, it is no phase.
    """
    position = palette.position.astype(np.float32)
    for _ in range(rounds):
        low, high = extreme_labels(labels, 3)
        between = (low < labels) & (labels < high)
        if not between.any():
            break
        faint = position[high] - position[low] < FAINT_STEP * palette.scale
        thin = between & np.where(faint, ~opened(labels, 2), ~opened(labels, 1))
        if not thin.any():
            break
        lower, upper = low[thin], high[thin]
        middle = 0.5 * (position[lower] + position[upper])
        labels = labels.copy()
        labels[thin] = np.where(level[thin] < middle, lower, upper)
    return labels


def opened(labels: NDArray[np.uint8], reach: int = 1) -> NDArray[np.bool_]:
    """Pixels that belong to some square of side ``2 * reach + 1`` of one label."""
    low, high = extreme_labels(labels, reach)
    # One more than the label where the square around is uniform, else 0. All uniform squares over a
    # pixel carry its own label, so a running maximum tells whether there is one.
    core = np.where(low == high, labels + np.uint8(1), np.uint8(0))
    return np.asarray(extreme_labels(core, reach)[1] == labels + np.uint8(1))
