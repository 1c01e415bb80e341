"""What can be wrong with phases that are well-formed: chemistry, densities, names, contexts, hazards."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from phaseid.phases.catalogue import fold
from phaseid.phases.contexts import ContextTree
from phaseid.phases.hazards import reasons
from phaseid.phases.mixture import is_mixture
from phaseid.phases.oxidation import TOLERANCE, imbalance
from phaseid.phases.records import Phase
from phaseid.physics.elements import SYMBOLS, atomic_masses

_AVOGADRO_A3 = 0.602214076  # atoms per (g/mol) per cm3 to per cubic angstrom
# Volume per atom other than hydrogen, cubic angstrom: from diamond (5.7) to caesium halides; solids that
# are mostly oxygen lie closer together. Bounds with room, from memory.
_VOLUMES = {"oxygen": (6.5, 30.0), "other": (5.0, 60.0)}
_HYDROGEN, _OXYGEN = SYMBOLS.index("H"), SYMBOLS.index("O")
# Densities apart by more than this are those of different structures.
_SAME_DENSITY = 0.015
# Fewer phases teach no volumes; an element in fewer is predicted by nothing but itself.
_ENOUGH, _OFTEN = 200, 8
_ODD = 1.35
_CAUTION = ("local", "licensed", "rules", "regulation")


@dataclass(frozen=True)
class Finding:
    """Something a check found.

    Attributes
    ----------
    kind : {"fault", "remark"}
        A fault must be mended; a remark is a place to look.
    phase, location : str
    message : str
        What, and what to do.
    """

    kind: Literal["fault", "remark"]
    phase: str
    location: str
    message: str


def check(phases: Sequence[Phase], contexts: ContextTree) -> list[Finding]:
    """Check phases.

    Parameters
    ----------
    phases : sequence of Phase
    contexts : ContextTree

    Returns
    -------
    list of Finding
        Faults first.
    """
    found = check_entries(phases, contexts)
    found += _names(phases)
    found += _compositions(phases)
    found += odd_densities(phases)
    found += _unreached(phases, contexts)
    return sorted(found, key=lambda f: f.kind)


def check_entries(phases: Sequence[Phase], contexts: ContextTree) -> list[Finding]:
    """Check phases one by one: chemistry, density, hazard, contexts.

    Parameters
    ----------
    phases : sequence of Phase
    contexts : ContextTree

    Returns
    -------
    list of Finding
    """
    found: list[Finding] = []
    for phase in phases:
        found += _chemistry(phase)
        found += _hazard(phase)
        found += _contexts(phase, contexts)
    return found


def _fault(phase: Phase, message: str) -> Finding:
    return Finding("fault", phase.name, phase.location, message)


def _remark(phase: Phase, message: str) -> Finding:
    return Finding("remark", phase.name, phase.location, message)


def _chemistry(phase: Phase) -> list[Finding]:
    found = []
    rows, _ = phase.parsed.variants(5)
    if not is_mixture(phase.formula):
        worst = max(imbalance(row) for row in rows)
        if worst > TOLERANCE:
            found.append(
                _fault(
                    phase,
                    f"charges in {phase.formula} cannot balance ({worst:.2f} per atom left over); "
                    "correct the formula or its ranges.",
                )
            )
    if phase.density_range is not None:
        found += _density(phase, rows)
    return found


def _density(
    phase: Phase, rows: np.ndarray[tuple[int, ...], np.dtype[np.float64]]
) -> list[Finding]:
    assert phase.density_range is not None
    atoms = rows / atomic_masses()
    heavy = atoms.sum(axis=1) - atoms[:, _HYDROGEN]
    oxygen = np.median(atoms[:, _OXYGEN] / np.maximum(heavy, 1e-12))
    low, high = _VOLUMES["oxygen" if oxygen > 0.4 else "other"]
    largest = float(np.max(1.0 / np.maximum(heavy, 1e-12))) / (
        phase.density_range[0] * _AVOGADRO_A3
    )
    smallest = float(np.min(1.0 / np.maximum(heavy, 1e-12))) / (
        phase.density_range[1] * _AVOGADRO_A3
    )
    if largest >= low and smallest <= high:
        return []
    ends = "-".join(f"{d:g}" for d in dict.fromkeys(phase.density_range))
    return [
        _fault(
            phase,
            f"a density of {ends} g/cm3 gives {smallest:.1f} to {largest:.1f} cubic angstrom per atom, "
            f"{low:g} to {high:g} are possible; correct the density or the formula.",
        )
    ]


def _hazard(phase: Phase) -> list[Finding]:
    why = reasons(phase, phase.parsed.variants(5)[0])
    if not phase.hazard:
        return [_fault(phase, f"{why[0][0]} but has no hazard; add one sentence.")] if why else []
    said = phase.hazard.casefold()
    found = [
        _remark(phase, f"{reason}, which its hazard does not name; add it.")
        for reason, words in why
        if not any(w in said for w in words)
    ]
    if not any(w in said for w in _CAUTION):
        found.append(_remark(phase, "its hazard does not defer to local rules; add that."))
    return found


def _contexts(phase: Phase, contexts: ContextTree) -> list[Finding]:
    known = set(contexts.paths)
    unreached = " and no other, so nothing reaches it" if not known & set(phase.contexts) else ""
    return [
        _fault(
            phase,
            f"names the context {path!r}, which nobody defines{unreached}; correct it or define it.",
        )
        for path in phase.contexts
        if path not in known
    ]


def _names(phases: Sequence[Phase]) -> list[Finding]:
    found = []
    owner: dict[str, Phase] = {}
    for phase in phases:
        first = owner.setdefault(fold(phase.name), phase)
        if first is not phase:
            found.append(_fault(phase, f"{phase.name!r} is also in {first.location}; rename one."))
    for phase in phases:
        for name in phase.other_names:
            other = owner.setdefault(fold(name), phase)
            if other is not phase:
                found.append(
                    _fault(
                        phase,
                        f"its other name {name!r} belongs to {other.name} in {other.location}; remove "
                        "one, or nobody knows which is meant.",
                    )
                )
    return found


def _compositions(phases: Sequence[Phase]) -> list[Finding]:
    """Phases with the same compositions and crystal system that not even density tells apart."""
    seen: dict[tuple[bytes, str | None], list[Phase]] = {}
    found = []
    for phase in phases:
        ends = phase.parsed.extremes()
        key = np.concatenate([ends.min(axis=0), ends.max(axis=0)]).round(3) + 0.0
        same = seen.setdefault((key.tobytes(), phase.crystal_system), [])
        first = next((p for p in same if _one_density(p, phase)), None)
        same.append(phase)
        if first is not None:
            found.append(
                _remark(
                    phase,
                    f"has the composition, crystal system and density of {first.name} "
                    f"({first.location}); keep both only if they are met in different contexts.",
                )
            )
    return found


def _one_density(first: Phase, second: Phase) -> bool:
    if first.density is None or second.density is None:
        return True
    return abs(first.density / second.density - 1) < _SAME_DENSITY


def odd_densities(phases: Sequence[Phase]) -> list[Finding]:
    """Densities far from those of like phases.

    Volumes of the elements that best add up to the molar volumes of all given phases (least squares,
    non-negative) predict each density; a phase more than a factor `_ODD` off is a place to look.
    """
    known = [p for p in phases if p.density is not None]
    if len(known) < _ENOUGH:
        return []
    rows = np.stack([p.parsed.mass_fractions() for p in known]) / atomic_masses()
    # An atom takes up another volume in a metal than as an ion among oxygen.
    salts = rows[:, _OXYGEN] / rows.sum(axis=1) > 0.2
    found: list[Finding] = []
    for group in (salts, ~salts):
        alike = [known[int(i)] for i in np.flatnonzero(group)]
        if len(alike) >= _ENOUGH:
            found += _odd_ones(alike, rows[group])
    return found


def _odd_ones(alike: Sequence[Phase], rows: NDArray[np.float64]) -> list[Finding]:
    from scipy.optimize import nnls

    density = np.array([p.density for p in alike], dtype=float)
    # Weighted by density, so that the error is relative.
    volumes, _ = nnls(rows * density[:, None], np.ones(len(alike)))
    ratio = rows @ volumes * density
    common = (rows > 0).sum(axis=0) >= _OFTEN
    usual = ~np.any((rows > 0) & ~common, axis=1)
    return [
        _remark(
            alike[int(i)],
            f"a density of {density[i]:g} g/cm3 is far from {density[i] / ratio[i]:.2f}, which the other "
            "phases let expect; check it.",
        )
        for i in np.flatnonzero(usual & (np.abs(np.log(ratio)) > np.log(_ODD)))
    ]


def _unreached(phases: Sequence[Phase], contexts: ContextTree) -> list[Finding]:
    listed = {c for p in phases for c in p.contexts}
    return [
        Finding(
            "remark",
            context.path,
            "",
            f"no phase is listed for the context {context.path}, above or below it; add some.",
        )
        for context in contexts.all()
        if not any(
            c == context.path
            or c.startswith(context.path + "/")
            or context.path.startswith(c + "/")
            for c in listed
        )
    ]
