"""Limits of the prediction for a phase."""

from __future__ import annotations

import numpy as np
import pytest

from phaseid.physics.elements import from_atoms, pure
from phaseid.physics.validity import phase_flags


@pytest.mark.parametrize(
    ("atoms", "codes"),
    [
        ({"Fe": 1}, set()),
        ({"Si": 1, "O": 2}, set()),
        ({"H": 2, "O": 1}, {"hydrogen", "light-with-heavy"}),
        ({"Li": 2, "O": 1}, {"light-elements"}),
        ({"Be": 1}, {"light-elements"}),
        ({"Th": 1, "Si": 1, "O": 4}, {"light-with-heavy"}),
        ({"Pu": 1, "O": 2}, {"beyond-uranium"}),
    ],
)
def test_flags_of_phases(atoms: dict[str, float], codes: set[str]) -> None:
    found = {flag.code for flag in phase_flags(from_atoms(atoms))}
    assert codes <= found
    if not codes:
        assert not found


def test_the_spread_is_named_in_per_cent() -> None:
    (flag,) = phase_flags(from_atoms({"Th": 1, "Si": 1, "O": 4}))
    assert "%" in flag.message
    assert not phase_flags(np.zeros(103))
    assert not phase_flags(pure("U"))
