"""From specks to the phases they are grains of."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from phaseid.image.contrast import contrast_of
from phaseid.image.specks import STEP, Speck

FloatArray = NDArray[np.float64]

# What a phase needs to be believed: several specks that agree, or one that is large.
FEWEST = 3
FEWEST_PIXELS = 20
ALONE_PIXELS = 100
# In surroundings that scatter by this many times the noise, spots are common without being a phase.
TEXTURED = 2.0
FEWEST_TEXTURED = 30
# Where there are pores, small dark spots of a grey nearer to theirs than this are pores too; other dark
# spots may be pores cut shallow, and are only reported.
NEAR_VOID = 0.45
# More kinds of specks than this, and they are not phases but structure of another sort.
MOST_KINDS = 4
# Greys of small specks are uncertain by this share of their contrast whatever the statistics say.
CONTRAST_SHARE = 0.15
# Specks agree if their greys differ by less than this many standard errors.
AGREEMENT = 2.5
# Error of a contrast from the unknown shapes and blur, as a share of it.
SHAPE_ERROR = 0.04
BLUR_ERROR = 0.25
DEFAULT_BLUR = 1.0
# Where lines hold this many times the pixels of round specks, the round ones are pieces of lines.
LINES_OVER_SPECKS = 3.0
# Shorter ones are odd-shaped grains.
LINE_LENGTH = 25.0


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
    lines: tuple[Speck, ...] = ()


def sort_specks(
    specks: Sequence[Speck],
    position: FloatArray,
    blur_px: float | None,
    height_se: float,
    span: tuple[float, float],
    void: int | None = None,
) -> Sorted:
    """Group specks by their own grey.

    Parameters
    ----------
    specks : sequence of Speck
    position : ndarray
        Of the labels, on the noise axis.
    blur_px : float or None
        None where no border of the image tells it.
    height_se : float
        Standard error of a speck's height.
    span : (float, float)
        Greys that occur, on the noise axis: no phase lies outside.
    void : int, optional
        Label of pores, if there are any.

    Returns
    -------
    Sorted
    """
    lines = [s for s in specks if s.long]
    dark = sum(s.pixels for s in lines if s.height < 0 and s.length > LINE_LENGTH)
    bright = sum(s.pixels for s in lines if s.height > 0 and s.length > LINE_LENGTH)
    drawn = tuple(s for s in lines if s.length > LINE_LENGTH)
    # What lies in a pore is its floor or dust.
    round_ones = [s for s in specks if not s.long and s.matrix != void]
    for sign, line in ((-1.0, dark), (1.0, bright)):
        same = [s for s in round_ones if s.height * sign > 0]
        if line > LINES_OVER_SPECKS * sum(s.pixels for s in same):
            round_ones = [s for s in round_ones if s.height * sign <= 0]
    if not round_ones:
        return Sorted((), dark, bright, (), drawn)
    own, error = _greys(round_ones, position, blur_px, height_se, span)
    phases: list[RarePhase] = []
    alone: list[Speck] = []
    for members in _groups(own, error, np.array([s.pixels for s in round_ones], float)):
        chosen = tuple(round_ones[i] for i in members)
        pixels = sum(s.pixels for s in chosen)
        textured = float(np.median([s.texture for s in chosen])) > TEXTURED
        fewest = FEWEST_TEXTURED if textured else FEWEST
        enough = len(chosen) >= fewest and pixels >= FEWEST_PIXELS
        if not enough and (textured or pixels < ALONE_PIXELS):
            alone.extend(chosen)
            continue
        mean, se = _common(chosen, position, blur_px, height_se, span)
        label = _same(mean, se, chosen, position)
        dark = sum(s.pixels for s in chosen if s.height < 0) > pixels / 2
        if label is None and void is not None and dark:
            matrix = float(np.mean([position[s.matrix] for s in chosen]))
            if mean - position[void] >= NEAR_VOID * (matrix - position[void]):
                alone.extend(chosen)
                continue
            label = void
        phases.append(RarePhase(mean, se, chosen, label))
    if sum(p.label is None for p in phases) > MOST_KINDS:
        alone.extend(s for p in phases if p.label is None for s in p.specks)
        phases = [p for p in phases if p.label is not None]
    return Sorted(tuple(phases), dark, bright, tuple(alone), drawn)


def _greys(
    specks: Sequence[Speck],
    position: FloatArray,
    blur_px: float | None,
    height_se: float,
    span: tuple[float, float],
) -> tuple[FloatArray, FloatArray]:
    """Grey of each speck by itself, and its error."""
    found = [_common((s,), position, blur_px, height_se, span) for s in specks]
    return np.array([f[0] for f in found]), np.array([f[1] for f in found])


def _common(
    specks: Sequence[Speck],
    position: FloatArray,
    blur_px: float | None,
    height_se: float,
    span: tuple[float, float],
) -> tuple[float, float]:
    """Grey that the specks share: each matrix gives one estimate of it, and the best are averaged."""
    means, errors = [], []
    keys = {(s.matrix, s.height > 0) for s in specks}
    for matrix, bright in keys:
        mine = [s for s in specks if (s.matrix, s.height > 0) == (matrix, bright)]
        contrast, se = contrast_of(
            np.array([abs(s.flux) for s in mine]),
            np.sqrt(np.array([float(s.reach) for s in mine])),
            np.array([abs(s.height) for s in mine]),
            height_se,
            DEFAULT_BLUR if blur_px is None else blur_px,
            STEP,
        )
        means.append(position[matrix] + (contrast if bright else -contrast))
        shape = SHAPE_ERROR if blur_px is not None else BLUR_ERROR
        errors.append(np.hypot(se, shape * contrast))
    weight = 1.0 / np.array(errors) ** 2
    mean = float(weight @ np.array(means) / weight.sum())
    return float(np.clip(mean, *span)), float(1.0 / np.sqrt(weight.sum()))


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
) -> int | None:
    matrices = {s.matrix for s in specks}
    distance = np.abs(position - mean)
    if len(matrices) == 1:
        distance[list(matrices)] = np.inf
    nearest = int(np.argmin(distance))
    contrast = float(np.mean([abs(mean - position[s.matrix]) for s in specks]))
    if distance[nearest] < max(3.0 * se, CONTRAST_SHARE * contrast, 0.5):
        return nearest
    return None
