"""Which labels are phases: not slopes cut in two, not blends, not one grain's orientation after another."""

from __future__ import annotations

import itertools
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from phaseid.image.labelling import Palette
from phaseid.image.labelpass import Evidence
from phaseid.image.modes import Mode

FloatArray = NDArray[np.float64]

# A border between phases is a step; across a cut slope the grey hardly changes.
LEAST_STEP = 0.5
FEWEST_CONTACTS = 40
# A label that lives between darker and brighter ones and has no inside is a blend.
RIM_SHARE = 0.55
CORE_SHARE = 0.12
# Orientation contrast of metals reaches some per cent of the signal (common practice: up to 10 %).
CHANNELLING_SHARE = 0.12


@dataclass(frozen=True)
class Verdict:
    """What becomes of the labels.

    Attributes
    ----------
    group : ndarray of int, shape (labels,)
        Labels of the same group are one phase; -1 for labels that are none.
    reasons : dict
        Codes of what was merged or dropped, with a number for the message.
    """

    group: NDArray[np.intp]
    reasons: dict[str, float]


def judge_borders(evidence: Evidence, palette: Palette) -> Verdict:
    """Merge labels parted by no step; drop blends.

    Parameters
    ----------
    evidence : Evidence
    palette : Palette

    Returns
    -------
    Verdict
    """
    number = len(palette.position)
    reasons: dict[str, float] = {}
    blend = blends(evidence)
    group = np.arange(number)
    step, contacts = evidence.step - evidence.step.T, evidence.contacts + evidence.contacts.T
    kept = np.flatnonzero(~blend)
    for a, b in itertools.pairwise(kept):
        if contacts[a, b] < FEWEST_CONTACTS:
            continue
        expected = palette.position[b] - palette.position[a]
        ratio = step[a, b] / contacts[a, b] / max(expected, 1e-9)
        if ratio < LEAST_STEP:
            group[group == group[b]] = group[a]
            reasons["slope"] = reasons.get("slope", 0.0) + 1.0
    group[blend] = -1
    if blend.any():
        reasons["blend"] = float(evidence.pixels[blend].sum())
    return Verdict(group, reasons)


def blends(evidence: Evidence) -> NDArray[np.bool_]:
    """Labels that exist only between others."""
    pixels = np.maximum(evidence.pixels, 1.0)
    blend = (evidence.rim / pixels > RIM_SHARE) & (evidence.core / pixels < CORE_SHARE)
    small = evidence.small / pixels
    blend |= (evidence.rim / pixels > 0.25) & (small > 0.6) & (evidence.core / pixels < 0.25)
    blend |= evidence.pixels == 0
    if len(blend):
        blend[np.argmax(evidence.pixels)] = False
    return np.asarray(blend)


def border_width(evidence: Evidence, palette: Palette) -> float | None:
    """Standard deviation of the blur in pixels, from how steep the strongest borders are."""
    step = palette.position[None, :] - palette.position[:, None]
    strong = (np.abs(step) > 6.0) & (evidence.sharp_contacts > 0)
    count = evidence.sharp_contacts[strong].sum()
    if count < 200:
        return None
    ratio = float((evidence.sharp[strong] * np.sign(step[strong])).sum() / count)
    mean = float((np.abs(step[strong]) * evidence.sharp_contacts[strong]).sum() / count)
    share = ratio / mean
    # Over one pixel a Gaussian border rises by 0.383 / s; borders that lie askew rise less. The factor
    # was found on simulated borders in all directions (s from 0.8 to 2).
    return float(np.clip(0.352 / max(share, 1e-3), 0.4, 4.0))


def palette_of(modes: list[Mode], level: FloatArray, scale: float) -> Palette:
    """Palette with one label per mode; a mode wider than the noise widens its label."""
    position = np.array([m.position for m in modes])
    excess = np.array([max(m.spread**2 - (1.3 * level[m.step]) ** 2, 0.0) for m in modes])
    return Palette(position, 1.0 + excess, scale)
