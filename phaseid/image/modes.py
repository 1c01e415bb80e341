"""Greys that stand out: modes of the histograms of flat places, from the coarsest scale to the finest."""

from __future__ import annotations

import itertools
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from phaseid.image.flatness import STEPS, FlatCounts
from phaseid.image.response import Response

FloatArray = NDArray[np.float64]

# Gain in log-likelihood of "two rates" over "one rate" for a peak beside a valley; 7 nats make a chance
# valley rarer than one in a thousand after looking everywhere.
EVIDENCE = 7.0
# A valley shallower than this share of the lower peak does not part two phases.
DEEPEST_VALLEY = 0.75
# Independent places that a mode needs.
FEWEST_PLACES = 8.0
# Peaks nearer than this many widths of a local mean are one.
NEAREST = 2.2
SMOOTHING = 0.7
# Greys further apart than this many standard deviations of the noise leave their mark on averages.
QUANTISED = 1.7
QUANTUM_SMOOTHING = 0.6


@dataclass(frozen=True)
class Mode:
    """A grey that stands out.

    Attributes
    ----------
    position : float
        On the noise axis.
    spread : float
        Standard deviation of the flat greys around it, at the scale where it was found.
    step : int
        That scale.
    places : float
        Independent flat places it rests on.
    """

    position: float
    spread: float
    step: int
    places: float


def find_modes(
    flat: FlatCounts,
    response: Response,
    correlated: float = 1.0,
    quantum: Callable[[FloatArray], FloatArray] | None = None,
) -> list[Mode]:
    """Find the modes of all scales.

    Parameters
    ----------
    flat : FlatCounts
    response : Response
    correlated : float
        Pixels that count as one independent pixel.
    quantum : callable, optional
        Distance between neighbouring greys of the image at given positions. Where it exceeds the noise,
        averages pile up on the greys and say nothing of phases.

    Returns
    -------
    list of Mode
        Ascending position.
    """
    found: list[Mode] = []
    for step in range(STEPS, 0, -1):
        for mode in _modes_of(flat, response, step, correlated, quantum):
            apart = NEAREST * max(float(response.level[step]), mode.spread)
            if all(abs(mode.position - m.position) > max(apart, NEAREST * m.spread) for m in found):
                found.append(mode)
    return sorted(found, key=lambda m: m.position)


def _modes_of(
    flat: FlatCounts,
    response: Response,
    step: int,
    correlated: float,
    quantum: Callable[[FloatArray], FloatArray] | None,
) -> list[Mode]:
    counts = flat.counts[step].astype(float)
    sd = response.level[step] / flat.width[step]
    area = response.area[step] * correlated
    if counts.sum() / area < FEWEST_PLACES:
        return []
    density = smooth_counts(counts, max(SMOOTHING * sd, 0.5))
    if quantum is not None:
        step_of = quantum(flat.centres(step))
        coarse = step_of > QUANTISED
        if coarse.any():
            width = QUANTUM_SMOOTHING * float(step_of[coarse].max()) / flat.width[step]
            density = np.where(coarse, smooth_counts(counts, width), density)
    # Places within two standard deviations: what a peak of a pure phase holds.
    window = max(3, round(4 * sd))
    places = density * window / area
    peaks = _persistent(density, places)
    modes = []
    for left, peak, right in peaks:
        if places[peak] < FEWEST_PLACES:
            continue
        modes.append(_describe(flat, density, step, left, peak, right, places[peak]))
    return modes


def smooth_counts(counts: FloatArray, sd: float) -> FloatArray:
    reach = int(np.ceil(4 * sd))
    offsets = np.arange(-reach, reach + 1)
    kernel = np.exp(-0.5 * (offsets / sd) ** 2)
    return (
        np.convolve(counts, kernel / kernel.sum(), mode="same")[: len(counts)]
        if len(counts) >= len(kernel)
        else np.convolve(counts, kernel / kernel.sum(), mode="full")[reach : reach + len(counts)]
    )


def _persistent(density: FloatArray, places: FloatArray) -> list[tuple[int, int, int]]:
    """Peaks with a significant valley on either side, as (left valley, peak, right valley)."""
    inner = np.flatnonzero((density[1:-1] > density[:-2]) & (density[1:-1] >= density[2:])) + 1
    peaks = [int(p) for p in inner]
    if not peaks:
        return [(0, int(np.argmax(density)), len(density) - 1)]
    valleys = [0]
    for a, b in itertools.pairwise(peaks):
        valleys.append(a + int(np.argmin(density[a : b + 1])))
    valleys.append(len(density) - 1)
    # Remove the least convincing valley until all that remain convince.
    while len(peaks) > 1:
        strength = []
        for n in range(1, len(peaks)):
            lower = min(peaks[n - 1], peaks[n], key=lambda p: places[p])
            strength.append(_evidence(places[lower], places[valleys[n]]))
        weakest = int(np.argmin(strength))
        if strength[weakest] >= EVIDENCE:
            break
        keep = (
            peaks[weakest]
            if density[peaks[weakest]] >= density[peaks[weakest + 1]]
            else peaks[weakest + 1]
        )
        peaks[weakest : weakest + 2] = [keep]
        del valleys[weakest + 1]
    return [(valleys[n], peaks[n], valleys[n + 1]) for n in range(len(peaks))]


def _evidence(peak: float, valley: float) -> float:
    if valley > DEEPEST_VALLEY * peak:
        return 0.0
    mean = 0.5 * (peak + valley)
    gain = peak * np.log(peak / mean)
    if valley > 0:
        gain += valley * np.log(valley / mean)
    return float(gain)


def _describe(
    flat: FlatCounts,
    density: FloatArray,
    step: int,
    left: int,
    peak: int,
    right: int,
    places: float,
) -> Mode:
    centres = flat.centres(step)
    counts = flat.counts[step]
    # Half height on either side, within the valleys, gives a width that tails cannot pull.
    half = density[peak] / 2
    a, b = peak, peak
    while a > left and density[a] > half:
        a -= 1
    while b < right and density[b] > half:
        b += 1
    box = slice(a, b + 1)
    total = counts[box].sum()
    position = float(counts[box] @ centres[box] / total) if total else float(centres[peak])
    spread = max(b - a, 1) * flat.width[step] / 2.355
    return Mode(position, float(spread), step, float(places))
