"""Writing database files."""

from __future__ import annotations

import re
import tempfile
import textwrap
from collections.abc import Sequence
from pathlib import Path
from typing import Any

from phaseid.errors import InputError
from phaseid.files import write_text
from phaseid.phases.catalogue import fold
from phaseid.phases.database import SCHEMA, load
from phaseid.phases.records import Phase


def write_database(path: Path, name: str, phases: Sequence[Phase]) -> None:
    """Write a database file in one step.

    Raises
    ------
    InputError
        If it cannot be written.
    """
    write_text(path, to_yaml(name, phases))


def append_phase(path: Path, phase: Phase) -> int:
    """Add one phase to a database file and leave all that is in it as it stands, comments included.

    Parameters
    ----------
    path : Path
        Made if it does not exist.
    phase : Phase

    Returns
    -------
    int
        Phases in the file now.

    Raises
    ------
    InputError
        If the file is faulty, has the phase already, or cannot be written; it is left unchanged.
    """
    if not path.exists():
        write_database(path, path.stem, [phase])
        return 1
    present = load(path).phases
    if any(fold(p.name) == fold(phase.name) for p in present):
        raise InputError(f"{path} already has a phase {phase.name!r}; edit the file to change it.")
    entry = _dumped([_entry(phase)])
    text = path.read_text(encoding="utf-8-sig").rstrip() + "\n"
    last = re.search(r"^( *)- +\S", text[text.index("phases:") :], re.MULTILINE)
    if last is None:
        write_database(path, path.stem, [*present, phase])
        return len(present) + 1
    made = text + textwrap.indent(entry, last[1])
    # What is written must be readable as what was meant, or the file was laid out otherwise.
    with tempfile.TemporaryDirectory() as folder:
        trial = Path(folder) / path.name
        write_text(trial, made)
        try:
            again = load(trial).phases
        except InputError:
            again = ()
    if [p.name for p in again] != [*(p.name for p in present), phase.name]:
        raise InputError(
            f"{path} is laid out in a way nothing can be added to; put the phases last, one '- name:' each."
        )
    write_text(path, made)
    return len(again)


def to_yaml(name: str, phases: Sequence[Phase]) -> str:
    """Text of a database file."""
    entries = [_entry(phase) for phase in phases]
    head = {"schema": SCHEMA, "name": name, "title": name, "licence": "private"}
    return _dumped({**head, "phases": entries})


def _entry(phase: Phase) -> dict[str, Any]:
    entry: dict[str, Any] = {"name": phase.name}
    if phase.other_names:
        entry["other_names"] = list(phase.other_names)
    entry["formula"] = phase.formula
    if phase.ranges:
        entry["ranges"] = {k: [float(a), float(b)] for k, (a, b) in phase.ranges.items()}
    if phase.density_range:
        low, high = phase.density_range
        entry["density"] = low if low == high else [low, high]
    if phase.crystal_system:
        entry["crystal_system"] = phase.crystal_system
    entry["contexts"] = dict(phase.contexts)
    for key in ("note", "hazard"):
        if getattr(phase, key):
            entry[key] = getattr(phase, key)
    entry["source"] = phase.source
    return entry


def _dumped(data: Any) -> str:
    import yaml

    # Aliases are refused when the file is read, so equal values must be written out each time.
    dumper = type("Plain", (yaml.SafeDumper,), {"ignore_aliases": lambda self, data: True})
    text: str = yaml.dump(data, Dumper=dumper, sort_keys=False, allow_unicode=True, width=100)
    return text
