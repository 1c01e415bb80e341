"""What can be wrong with phases that are well-formed: chemistry, densities, names, contexts, hazards."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np

from phaseid.phases.catalogue import fold
from phaseid.phases.contexts import ContextTree
from phaseid.phases.mixture import is_mixture
from phaseid.phases.oxidation import TOLERANCE, imbalance
from phaseid.phases.records import Phase
from phaseid.physics.elements import SYMBOLS, atomic_masses

_AVOGADRO_A3 = 0.602214076  # atoms per (g/mol) per cm3 to per cubic angstrom
# Volume per atom other than hydrogen, cubic angstrom: from diamond (5.7) to caesium halides; solids that
# are mostly oxygen lie closer together. Bounds with room, from memory.
_VOLUMES = {"oxygen": (6.5, 30.0), "other": (5.0, 60.0)}
_HYDROGEN, _OXYGEN = SYMBOLS.index("H"), SYMBOLS.index("O")

_TOXIC = ("Be", "Pb", "As", "Hg", "Cd", "Tl", "U", "Th", "Ra", "Pu", "Np", "Am")
_ASBESTOS = (
    "chrysotile",
    "crocidolite",
    "amosite",
    "tremolite",
    "actinolite",
    "anthophyllite",
    "riebeckite",
    "grunerite",
    "erionite",
)
# Below this mass fraction an element is a trace that calls for no word of its own.
_TRACE = 0.002


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
    found: list[Finding] = []
    for phase in phases:
        found += _chemistry(phase)
        found += _hazard(phase)
        found += _contexts(phase, contexts)
    found += _names(phases)
    found += _compositions(phases)
    found += _unreached(phases, contexts)
    return sorted(found, key=lambda f: f.kind)


def _fault(phase: Phase, message: str) -> Finding:
    return Finding("fault", phase.name, phase.location, message)


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
    if phase.hazard:
        return []
    rows, _ = phase.parsed.variants(5)
    present = rows.max(axis=0)
    for symbol in _TOXIC:
        if present[SYMBOLS.index(symbol)] > _TRACE:
            return [
                _fault(phase, f"holds {symbol} but has no hazard; add one sentence of caution.")
            ]
    words = set(re.findall(r"\w+", " ".join(phase.names).casefold()))
    for fibre in _ASBESTOS:
        if fibre in words:
            return [_fault(phase, f"{fibre} can be fibrous but has no hazard; add one sentence.")]
    if phase.crystal_system not in (None, "amorphous") and fold(phase.formula) == "sio2":
        return [
            _fault(phase, "is crystalline silica but has no hazard; add one sentence of caution.")
        ]
    nickel, sulphur = (present[SYMBOLS.index(s)] > 0.05 for s in ("Ni", "S"))
    if nickel and sulphur and present[_OXYGEN] == 0:
        return [
            _fault(phase, "is a nickel sulphide but has no hazard; add one sentence of caution.")
        ]
    return []


def _contexts(phase: Phase, contexts: ContextTree) -> list[Finding]:
    known = set(contexts.paths)
    return [
        _fault(phase, f"names the context {path!r}, which nobody defines; correct it or define it.")
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
            other = owner.get(fold(name))
            if other is not None and other is not phase:
                found.append(
                    _fault(
                        phase,
                        f"its other name {name!r} is the name of a phase in {other.location}; remove it.",
                    )
                )
    return found


def _compositions(phases: Sequence[Phase]) -> list[Finding]:
    seen: dict[tuple[str, str | None], Phase] = {}
    found = []
    for phase in phases:
        key = (fold(phase.formula), phase.crystal_system)
        first = seen.setdefault(key, phase)
        if first is not phase and phase.ranges == first.ranges:
            found.append(
                Finding(
                    "remark",
                    phase.name,
                    phase.location,
                    f"has the formula and crystal system of {first.name} ({first.location}); keep both "
                    "only if they are met in different contexts.",
                )
            )
    return found


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
