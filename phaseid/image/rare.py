"""From specks to the phases they are grains of."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from phaseid.image.specks import Speck, deblurred

FloatArray = NDArray[np.float64]

# What a phase needs to be believed: several specks that agree, or one that is large.
FEWEST = 3
FEWEST_PIXELS = 20
ALONE_PIXELS = 40
# Specks agree if their greys differ by less than this many standard errors.
AGREEMENT = 2.5
# Error of a speck's contrast from its unknown shape, as a share of the contrast.
SHAPE_ERROR = 0.12
# Where lines hold this many times the pixels of round specks, the round ones are pieces of lines.
LINES_OVER_SPECKS = 3.0


@dataclass(frozen=True)
class RarePhase:
    """Specks of one grey.

    Attributes
    ----------
    position, position_se : float
        Grey on the noise axis, blur taken off, and its standard error.
    specks : tuple of Speck
    label : int or None
        Palette index, if it is a grey that is there already.
    """

    position: float
    position_se: float
    specks: tuple[Speck, ...]
    label: int | None


@dataclass(frozen=True)
class Sorted:
    """Rare phases, lines, and specks that stand alone."""

    phases: tuple[RarePhase, ...]
    dark_line_pixels: int
    bright_line_pixels: int
    alone: tuple[Speck, ...]


def sort_specks(
    specks: Sequence[Speck], position: FloatArray, blur_px: float, used: NDArray[np.bool_]
) -> Sorted:
    """Group specks by their own grey.

    Parameters
    ----------
    specks : sequence of Speck
    position : ndarray
        Of the labels, on the noise axis.
    blur_px : float
    used : ndarray of bool
        Labels that are phases.

    Returns
    -------
    Sorted
    """
    lines = [s for s in specks if s.long]
    dark = sum(s.pixels for s in lines if s.height < 0)
    bright = sum(s.pixels for s in lines if s.height > 0)
    round_ones = [s for s in specks if not s.long]
    for sign, line in ((-1.0, dark), (1.0, bright)):
        same = [s for s in round_ones if s.height * sign > 0]
        if line > LINES_OVER_SPECKS * sum(s.pixels for s in same):
            round_ones = [s for s in round_ones if s.height * sign <= 0]
    if not round_ones:
        return Sorted((), dark, bright, ())
    own, error = _greys(round_ones, position, blur_px)
    phases, alone = [], []
    for members in _groups(own, error, np.array([s.pixels for s in round_ones], float)):
        chosen = tuple(round_ones[i] for i in members)
        pixels = sum(s.pixels for s in chosen)
        enough = len(chosen) >= FEWEST and pixels >= FEWEST_PIXELS
        if not enough and pixels < ALONE_PIXELS:
            alone.extend(chosen)
            continue
        weight = 1.0 / error[members] ** 2
        mean = float(weight @ own[members] / weight.sum())
        scatter = float(np.sqrt(weight @ (own[members] - mean) ** 2 / weight.sum()))
        se = max(1.0 / np.sqrt(weight.sum()), scatter / np.sqrt(len(members)))
        phases.append(RarePhase(mean, float(se), chosen, _same(mean, se, chosen, position, used)))
    return Sorted(tuple(phases), dark, bright, tuple(alone))


def _greys(
    specks: Sequence[Speck], position: FloatArray, blur_px: float
) -> tuple[FloatArray, FloatArray]:
    own, error = [], []
    for s in specks:
        radius, contrast = deblurred(abs(s.flux), abs(s.height), blur_px)
        sign = 1.0 if s.height > 0 else -1.0
        own.append(position[s.matrix] + sign * contrast)
        area = max(np.pi * radius**2, 4.0)
        error.append(np.hypot(np.sqrt(s.reach) / area, SHAPE_ERROR * contrast))
    return np.array(own), np.array(error)


def _groups(own: FloatArray, error: FloatArray, weight: FloatArray) -> list[NDArray[np.intp]]:
    """Heaviest agreeing group first, until none is left."""
    left = np.arange(len(own))
    groups = []
    while len(left):
        agree = np.abs(own[left][:, None] - own[left]) < AGREEMENT * np.hypot(
            error[left][:, None], error[left]
        )
        centre = int(np.argmax(agree @ weight[left]))
        members = agree[centre]
        groups.append(left[members])
        left = left[~members]
    return groups


def _same(
    mean: float,
    se: float,
    specks: Sequence[Speck],
    position: FloatArray,
    used: NDArray[np.bool_],
) -> int | None:
    matrices = {s.matrix for s in specks}
    distance = np.abs(position - mean)
    distance[~used] = np.inf
    if len(matrices) == 1:
        distance[list(matrices)] = np.inf
    nearest = int(np.argmin(distance))
    contrast = min(abs(mean - position[m]) for m in matrices)
    if distance[nearest] < max(3.0 * se, 0.15 * contrast, 0.5):
        return nearest
    return None
