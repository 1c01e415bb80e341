"""Looking phases up: by name, elements, formula, mean atomic number, eta, context."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from phaseid.phases.catalogue import fold
from phaseid.phases.contexts import ContextTree
from phaseid.phases.formula import parse
from phaseid.phases.table import PhaseTable
from phaseid.physics.elements import atomic_number
from phaseid.physics.signals import eta

if TYPE_CHECKING:
    import pandas as pd

Floats = NDArray[np.float64]

SCHEMA = "phaseid-phases/1"
# Compositions closer than this in every mass fraction are the same formula.
SAME_COMPOSITION = 0.01


@dataclass(frozen=True)
class Filters:
    """What to look for; everything given must hold.

    Attributes
    ----------
    text : str or None
        Part of a name or other name.
    with_all, with_none : tuple of str
        Elements that must be possible, and must not.
    formula : str or None
        Same composition within `SAME_COMPOSITION`, somewhere in the range.
    mean_atomic_number, eta : (float, float) or None
        Windows; a phase of variable composition is in if any of its range is.
    context : str or None
    database : str or None
    hazard : bool
        Only phases with a hazard.
    """

    text: str | None = None
    with_all: tuple[str, ...] = ()
    with_none: tuple[str, ...] = ()
    formula: str | None = None
    mean_atomic_number: tuple[float, float] | None = None
    eta: tuple[float, float] | None = None
    context: str | None = None
    database: str | None = None
    hazard: bool = False


def look_up(table: PhaseTable, filters: Filters, contexts: ContextTree) -> list[int]:
    """Positions of the phases that pass all filters, in the table's order.

    Raises
    ------
    InputError
        For an unknown element, context or formula.
    """
    keep = np.ones(len(table.phases), dtype=bool)
    if filters.text:
        wanted = fold(filters.text)
        keep &= [any(wanted in fold(n) for n in p.names) for p in table.phases]
    for symbols, present in ((filters.with_all, True), (filters.with_none, False)):
        for symbol in symbols:
            atomic_number(symbol)
            keep &= [(symbol in p.parsed.elements) == present for p in table.phases]
    if filters.formula:
        keep &= _same_composition(table, filters.formula)
    if filters.mean_atomic_number:
        low, high = filters.mean_atomic_number
        keep &= (table.mean_atomic_number_max >= low) & (table.mean_atomic_number_min <= high)
    if filters.eta:
        keep &= _eta_in(table, *filters.eta)
    if filters.context:
        path = contexts.resolve(filters.context).path
        keep &= [_in_context(p.contexts, path) for p in table.phases]
    if filters.database:
        keep &= [p.database == filters.database for p in table.phases]
    if filters.hazard:
        keep &= [p.hazard is not None for p in table.phases]
    return [int(i) for i in np.flatnonzero(keep)]


def _eta_in(table: PhaseTable, low: float, high: float) -> NDArray[np.bool_]:
    c = table.conditions
    rows = np.concatenate([table.rows.corner_mass_fractions, table.rows.mass_fractions])
    owner = np.concatenate([table.rows.corner_phase, table.rows.phase])
    values = eta(rows, c.energy_keV, c.tilt_deg, c.model, c.rule)
    least, most = np.full(len(table.phases), np.inf), np.full(len(table.phases), -np.inf)
    np.minimum.at(least, owner, values)
    np.maximum.at(most, owner, values)
    return (most >= low) & (least <= high)


def _in_context(listed: Any, path: str) -> bool:
    """Listed for the context itself, for one above it, or for one below it."""
    return any(c == path or c.startswith(path + "/") or path.startswith(c + "/") for c in listed)


def _same_composition(table: PhaseTable, text: str) -> NDArray[np.bool_]:
    """Whether a composition lies within the range of each phase.

    Compositions whose amounts are linear in their variables fill the convex hull of their corners, in
    mass fractions as in atoms, so the nearest point of the hull decides.
    """
    wanted = parse(text).mass_fractions()
    rows = np.concatenate([table.rows.corner_mass_fractions, table.rows.mass_fractions])
    owner = np.concatenate([table.rows.corner_phase, table.rows.phase])
    count = len(table.phases)
    least, most = np.full((count, len(wanted)), np.inf), np.full((count, len(wanted)), -np.inf)
    np.minimum.at(least, owner, rows)
    np.maximum.at(most, owner, rows)
    inside = (least - SAME_COMPOSITION <= wanted) & (wanted <= most + SAME_COMPOSITION)
    found: NDArray[np.bool_] = np.asarray(inside.all(axis=1))
    for i in np.flatnonzero(found):
        found[i] = _distance_to_hull(rows[owner == i], wanted) < SAME_COMPOSITION
    return found


def _distance_to_hull(corners: Floats, wanted: Floats) -> float:
    """Largest difference in a mass fraction from the nearest point of a hull."""
    from scipy.optimize import nnls

    # A heavy last equation makes the shares of the corners sum to one.
    heavy = 1e3
    system = np.vstack([corners.T, np.full(len(corners), heavy)])
    shares, _ = nnls(system, np.append(wanted, heavy))
    return float(np.abs(shares @ corners - wanted).max())


def listing(table: PhaseTable, positions: Sequence[int]) -> dict[str, Any]:
    """The listing document `phaseid-phases/1`."""
    return {"schema": SCHEMA, "phases": [_entry(table, i) for i in positions]}


def _entry(table: PhaseTable, i: int) -> dict[str, Any]:
    phase = table.phases[i]
    low_high = phase.density_range
    return {
        "name": phase.name,
        "other_names": list(phase.other_names),
        "formula": phase.formula,
        "ranges": {k: list(v) for k, v in phase.ranges.items()},
        "database": phase.database,
        "density": phase.density,
        "density_range": None if low_high is None else list(low_high),
        "crystal_system": phase.crystal_system,
        "elements": sorted(phase.parsed.elements),
        "mean_atomic_number": _rounded(table.mean_atomic_number[i]),
        "mean_atomic_number_min": _rounded(table.mean_atomic_number_min[i]),
        "mean_atomic_number_max": _rounded(table.mean_atomic_number_max[i]),
        "eta": _rounded(table.eta[i]),
        "contexts": dict(phase.contexts),
        "note": phase.note,
        "hazard": phase.hazard,
        "source": phase.source,
    }


def to_frame(table: PhaseTable, positions: Sequence[int]) -> pd.DataFrame:
    """The listing as a table, one row per phase."""
    import pandas as pd

    rows = [_entry(table, i) for i in positions]
    for row in rows:
        row["other_names"] = "; ".join(row["other_names"])
        row["elements"] = " ".join(row["elements"])
        row["contexts"] = "; ".join(f"{c}: {w}" for c, w in row["contexts"].items())
        row.pop("ranges")
        row.pop("density_range")
    return pd.DataFrame(rows)


def _rounded(value: float) -> float:
    return float(f"{float(value):.7g}")
