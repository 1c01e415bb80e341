"""Compositions of all phases of a catalogue, worked out once and kept on disk."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from phaseid.phases.records import Phase
from phaseid.phases.stored import Arrays, cache_folder, key_of, stored

__all__ = ["Compositions", "cache_folder", "composition_key", "compositions", "work_out"]

Floats = NDArray[np.float64]

# Compositions a variable phase is represented by.
VARIANTS = 5


@dataclass(frozen=True)
class Compositions:
    """Rows of composition, several per phase of variable composition.

    Attributes
    ----------
    phase : ndarray of int, shape (R,)
        Phase of each row.
    share : ndarray of shape (R,)
        Weight of each row within its phase.
    mass_fractions : ndarray of shape (R, 103)
    corner_phase : ndarray of int, shape (C,)
    corner_mass_fractions : ndarray of shape (C, 103)
        Compositions at the ends of the ranges.
    """

    phase: NDArray[np.int32]
    share: Floats
    mass_fractions: Floats
    corner_phase: NDArray[np.int32]
    corner_mass_fractions: Floats


def work_out(phases: Sequence[Phase]) -> Compositions:
    """Work out all compositions.

    Raises
    ------
    InputError
        If a formula cannot be read.
    """
    rows: list[Floats] = []
    shares: list[Floats] = []
    owner: list[int] = []
    corners: list[Floats] = []
    corner_owner: list[int] = []
    for p, phase in enumerate(phases):
        found, weights = phase.parsed.variants(VARIANTS)
        rows.append(found)
        shares.append(weights)
        owner += [p] * len(found)
        ends = phase.parsed.extremes() if phase.parsed.is_variable else found
        corners.append(ends)
        corner_owner += [p] * len(ends)
    empty = np.zeros((0, 103))
    return Compositions(
        np.array(owner, dtype=np.int32),
        np.concatenate([*shares, np.zeros(0)]),
        np.concatenate([*rows, empty]),
        np.array(corner_owner, dtype=np.int32),
        np.concatenate([*corners, empty]),
    )


def compositions(phases: Sequence[Phase]) -> Compositions:
    """As `work_out`, kept on disk by content and version."""
    names = Compositions.__dataclass_fields__

    def make() -> Arrays:
        made = work_out(phases)
        return {name: getattr(made, name) for name in names}

    found = stored("compositions", composition_key(phases), make)
    if set(found) != set(names):
        return work_out(phases)
    return Compositions(**found)  # type: ignore[arg-type]


def composition_key(phases: Sequence[Phase]) -> str:
    """Key of all that the compositions of phases depend on."""
    content = repr([(p.formula, sorted(p.ranges.items())) for p in phases])
    return key_of(str(VARIANTS), content)
