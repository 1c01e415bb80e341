"""Measured backscatter coefficients the tests compare with."""

from __future__ import annotations

import csv
import os
from pathlib import Path

import numpy as np

from phaseid.physics.elements import Floats, from_atoms

# symbol, energy in keV, eta: facts from the papers named, as compiled by Joy 2001, A Database of
# Electron-Solid Interactions.
PUBLISHED = [
    ("C", 10.0, 0.072, "Bishop 1966"),
    ("C", 20.0, 0.060, "Heinrich 1966"),
    ("C", 30.0, 0.060, "Neubert & Rogaschewski 1980"),
    ("Al", 10.0, 0.150, "Reimer & Tollkamp 1980"),
    ("Al", 20.0, 0.164, "Neubert & Rogaschewski 1980"),
    ("Al", 30.0, 0.149, "Heinrich 1966"),
    ("Cu", 10.0, 0.318, "Heinrich 1966"),
    ("Cu", 20.0, 0.328, "Neubert & Rogaschewski 1980"),
    ("Cu", 20.0, 0.311, "Reimer & Tollkamp 1980"),
    ("Cu", 30.0, 0.319, "Bishop 1966"),
    ("Au", 10.0, 0.471, "Reimer & Tollkamp 1980"),
    ("Au", 20.0, 0.506, "Heinrich 1966"),
    ("Au", 30.0, 0.521, "Bishop 1966"),
]


def reference_file(name: str) -> Path | None:
    """A file of the reference folder beside the repository, or None where there is none."""
    beside = Path(__file__).parents[2].parent / "shared"
    path = Path(os.environ.get("PHASEID_SHARED", beside)) / "reference" / name
    return path if path.is_file() else None


def measured_rows(path: Path) -> list[tuple[str, float, float, str]]:
    """Symbol, energy in keV, eta and source of each measured value."""
    with path.open(encoding="utf-8", newline="") as stream:
        return [
            (row["material"], float(row["energy_keV"]), float(row["eta"]), row["source"])
            for row in csv.DictReader(stream)
        ]


def silicate_like() -> Floats:
    """Compositions of quartz, fayalite, zircon, galena and ice; shape (5, 103)."""
    return np.stack(
        [
            from_atoms({"Si": 1, "O": 2}),
            from_atoms({"Fe": 2, "Si": 1, "O": 4}),
            from_atoms({"Zr": 1, "Si": 1, "O": 4}),
            from_atoms({"Pb": 1, "S": 1}),
            from_atoms({"H": 2, "O": 1}),
        ]
    )
