"""All phases at given conditions, as arrays and as a table."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from phaseid.phases.compositions import (
    Compositions,
    composition_key,
    compositions,
    work_out,
)
from phaseid.phases.records import Phase
from phaseid.phases.stored import Arrays, key_of, stored
from phaseid.physics.averaging import mean_atomic_number
from phaseid.physics.conditions import Conditions
from phaseid.physics.depth import electron_range_um, information_depth_um
from phaseid.physics.model_error import model_error
from phaseid.physics.signals import eta, signal_under

if TYPE_CHECKING:
    import pandas as pd

Floats = NDArray[np.float64]

_BY_ROW = ("signal", "own_sd", "eta")


@dataclass(frozen=True)
class PhaseTable:
    """Predictions for P phases, whose R composition variants are rows.

    Attributes
    ----------
    phases : tuple of Phase
    conditions : Conditions
    rows : Compositions
    row_signal, row_own_sd : ndarray of shape (R,)
        Predicted signal of each row and the standard deviation of its own error.
    relative_sd, length : float
        The smooth, shared part of the model's error: see `phaseid.physics.model_error`.
    mean_atomic_number, mean_atomic_number_min, mean_atomic_number_max : ndarray of shape (P,)
        By mass fractions; extremes over the composition ranges.
    eta, signal : ndarray of shape (P,)
        Means over the composition range.
    range_um, information_depth_um : ndarray of shape (P,)
        NaN where no density is known.
    """

    phases: tuple[Phase, ...]
    conditions: Conditions
    rows: Compositions
    row_signal: Floats
    row_own_sd: Floats
    relative_sd: float
    length: float
    mean_atomic_number: Floats
    mean_atomic_number_min: Floats
    mean_atomic_number_max: Floats
    eta: Floats
    signal: Floats
    range_um: Floats
    information_depth_um: Floats

    @property
    def variable(self) -> NDArray[np.bool_]:
        """Phases of variable composition, shape (P,)."""
        return np.bincount(self.rows.phase, minlength=len(self.phases)) > 1

    def to_pandas(self) -> pd.DataFrame:
        """One row per phase."""
        import pandas as pd

        return pd.DataFrame(
            {
                "name": [p.name for p in self.phases],
                "formula": [p.formula for p in self.phases],
                "database": [p.database for p in self.phases],
                "density": [p.density for p in self.phases],
                "mean_atomic_number": self.mean_atomic_number,
                "eta": self.eta,
                "signal": self.signal,
                "range_um": self.range_um,
                "information_depth_um": self.information_depth_um,
            }
        )


def build(phases: Sequence[Phase], conditions: Conditions, *, cached: bool = True) -> PhaseTable:
    """Predict all phases at given conditions.

    Parameters
    ----------
    phases : sequence of Phase
    conditions : Conditions
    cached : bool
        Whether compositions and signals are kept on disk between runs; signals of a model or rule that
        is given as an object, not by name, are not.

    Returns
    -------
    PhaseTable

    Raises
    ------
    InputError
        If a formula cannot be read.
    """
    phases = tuple(phases)
    rows = compositions(phases) if cached else work_out(phases)
    count = len(phases)
    told = isinstance(conditions.model, str) and isinstance(conditions.rule, str)
    if cached and told:
        key = key_of(composition_key(phases), repr(conditions))
        physics = stored("signals", key, lambda: _physics(rows, conditions))
        # What another process left half-way is not what is wanted.
        if any(physics.get(n, np.zeros(0)).shape != rows.phase.shape for n in _BY_ROW):
            physics = _physics(rows, conditions)
    else:
        physics = _physics(rows, conditions)
    row_signal, own_sd, row_eta = (np.asarray(physics[n], dtype=float) for n in _BY_ROW)
    relative_sd, length = (float(v) for v in np.asarray(physics["smooth"], dtype=float))
    ends = mean_atomic_number(
        np.concatenate([rows.corner_mass_fractions, rows.mass_fractions]), "mass"
    )
    owner = np.concatenate([rows.corner_phase, rows.phase])
    lowest, highest = np.full(count, np.inf), np.full(count, -np.inf)
    np.minimum.at(lowest, owner, ends)
    np.maximum.at(highest, owner, ends)
    # Rows stand in the order of their phases, and every phase has one.
    starts = np.searchsorted(rows.phase, np.arange(count))
    shares = rows.share[:, None] * rows.mass_fractions
    mean_composition = np.add.reduceat(shares, starts) if count else shares
    density = np.array([np.nan if p.density is None else p.density for p in phases])
    return PhaseTable(
        phases,
        conditions,
        rows,
        row_signal,
        own_sd,
        relative_sd,
        length,
        _by_phase(rows, mean_atomic_number(rows.mass_fractions, "mass"), count),
        lowest,
        highest,
        _by_phase(rows, row_eta, count),
        _by_phase(rows, row_signal, count),
        _depth(electron_range_um, mean_composition, density, conditions),
        _depth(information_depth_um, mean_composition, density, conditions),
    )


def _physics(rows: Compositions, conditions: Conditions) -> Arrays:
    error = model_error(rows.mass_fractions, conditions)
    return {
        "signal": signal_under(rows.mass_fractions, conditions),
        "own_sd": np.asarray(error.own_sd),
        "eta": eta(
            rows.mass_fractions,
            conditions.energy_keV,
            conditions.tilt_deg,
            conditions.model,
            conditions.rule,
        ),
        "smooth": np.array([error.relative_sd, error.length]),
    }


def _by_phase(rows: Compositions, values: Floats, count: int) -> Floats:
    return np.bincount(rows.phase, rows.share * values, count).astype(float)


def _depth(law, composition: Floats, density: Floats, conditions: Conditions) -> Floats:  # type: ignore[no-untyped-def]
    found = np.full(len(density), np.nan)
    known = np.isfinite(density)
    if known.any():
        found[known] = law(composition[known], density[known], conditions.energy_keV)
    return found
