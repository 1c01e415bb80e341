"""Mean atomic numbers against published ones."""

from __future__ import annotations

import numpy as np
import pytest

from phaseid.errors import InputError
from phaseid.physics.averaging import (
    atomic_fractions,
    averaging_methods,
    mean_atomic_number,
)
from phaseid.physics.elements import from_atoms, pure

METHODS = [method.name for method in averaging_methods()]

# Mean atomic number by mass, two decimals, as handbooks list it for petrographers (Lloyd 1987,
# Mineralogical Magazine 51, 3, is one such list); quoted from memory.
HANDBOOK = {
    "quartz": ({"Si": 1, "O": 2}, 10.80),
    "albite": ({"Na": 1, "Al": 1, "Si": 3, "O": 8}, 10.71),
    "dolomite": ({"Ca": 1, "Mg": 1, "C": 2, "O": 6}, 10.87),
    "corundum": ({"Al": 2, "O": 3}, 10.65),
    "enstatite": ({"Mg": 1, "Si": 1, "O": 3}, 10.65),
    "kyanite": ({"Al": 2, "Si": 1, "O": 5}, 10.71),
    "forsterite": ({"Mg": 2, "Si": 1, "O": 4}, 10.58),
    "fayalite": ({"Fe": 2, "Si": 1, "O": 4}, 18.69),
    "calcite": ({"Ca": 1, "C": 1, "O": 3}, 12.57),
    "rutile": ({"Ti": 1, "O": 2}, 16.39),
    "magnetite": ({"Fe": 3, "O": 4}, 21.02),
    "pyrite": ({"Fe": 1, "S": 2}, 20.65),
    "zircon": ({"Zr": 1, "Si": 1, "O": 4}, 24.84),
    "galena": ({"Pb": 1, "S": 1}, 73.16),
}


@pytest.mark.parametrize("name", HANDBOOK)
def test_minerals_have_their_handbook_value(name: str) -> None:
    atoms, expected = HANDBOOK[name]
    assert mean_atomic_number(from_atoms(atoms)) == pytest.approx(expected, abs=0.02)


@pytest.mark.parametrize("method", METHODS)
def test_a_pure_element_has_its_own_number(method: str) -> None:
    for symbol, z in (("H", 1), ("Fe", 26), ("U", 92)):
        assert mean_atomic_number(pure(symbol), method) == pytest.approx(z)


def test_definitions_worked_by_hand_for_lead_sulphide() -> None:
    """PbS, Z = 82 and 16, one atom each: the sums are short enough for paper."""
    galena = from_atoms({"Pb": 1, "S": 1})
    heavy = galena[81]
    expected = {
        "mass": heavy * 82 + (1 - heavy) * 16,
        "electron": (82**2 + 16**2) / (82 + 16),
        "root-mean-square": np.sqrt((82**2 + 16**2) / 2),
        "everhart": (heavy * 82**2 + (1 - heavy) * 16**2) / (heavy * 82 + (1 - heavy) * 16),
        "z-fraction": (82**1.7 + 16**1.7) / (82**0.7 + 16**0.7),
    }
    assert set(expected) == set(METHODS)
    for method, value in expected.items():
        assert mean_atomic_number(galena, method) == pytest.approx(value)


def test_exponent_one_is_the_electron_fraction_and_zero_counts_atoms() -> None:
    zircon = from_atoms({"Zr": 1, "Si": 1, "O": 4})
    one = mean_atomic_number(zircon, "z-fraction", exponent=1.0)
    assert one == pytest.approx(mean_atomic_number(zircon, "electron"))
    zero = mean_atomic_number(zircon, "z-fraction", exponent=0.0)
    assert zero == pytest.approx((40 + 14 + 4 * 8) / 6)


def test_many_at_once_equal_one_by_one() -> None:
    stack = np.stack([from_atoms(atoms) for atoms, _ in HANDBOOK.values()]).reshape(2, 7, 103)
    for method in METHODS:
        together = mean_atomic_number(stack, method)
        assert together.shape == (2, 7)
        assert together[1, 3] == pytest.approx(float(mean_atomic_number(stack[1, 3], method)))


def test_atomic_fractions_of_silica() -> None:
    fractions = atomic_fractions(from_atoms({"Si": 1, "O": 2}))
    assert fractions[13] == pytest.approx(1 / 3)
    assert fractions[7] == pytest.approx(2 / 3)


def test_an_unknown_method_is_refused_with_the_known_ones() -> None:
    with pytest.raises(InputError, match="electron"):
        mean_atomic_number(pure("Fe"), "median")


def test_every_method_states_formula_and_source() -> None:
    for method in averaging_methods():
        assert method.formula
        assert any(character.isdigit() for character in method.source)
