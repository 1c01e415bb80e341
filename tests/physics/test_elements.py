"""Elements against a second library."""

from __future__ import annotations

import numpy as np
import periodictable
import pytest

from phaseid.errors import InputError
from phaseid.physics import elements
from phaseid.physics.elements import ELEMENT_COUNT, SYMBOLS


def test_symbols_and_numbers_agree_with_periodictable() -> None:
    assert len(SYMBOLS) == ELEMENT_COUNT
    for number, symbol in enumerate(SYMBOLS, start=1):
        assert periodictable.elements[number].symbol == symbol
        assert elements.atomic_number(symbol) == number


def test_masses_agree_with_periodictable() -> None:
    masses = elements.atomic_masses()
    assert masses.shape == (ELEMENT_COUNT,)
    theirs = np.array([periodictable.elements[z].mass for z in range(1, 84)])
    # Standard atomic weights were revised between the two libraries' tables.
    np.testing.assert_allclose(masses[:83], theirs, rtol=5e-4)
    # Elements without a standard weight: the libraries choose different isotopes.
    theirs = np.array([periodictable.elements[z].mass for z in range(84, 104)])
    np.testing.assert_allclose(masses[83:], theirs, rtol=0.03)


def test_mean_ionisation_energies() -> None:
    """Berger & Seltzer 1964, evaluated by hand: C 69.0, Al 162.8, Cu 313.9, Au 796.6 eV."""
    values = elements.mean_ionisation_keV()[[5, 12, 28, 78]] * 1e3
    np.testing.assert_allclose(values, [69.0, 162.8, 313.9, 796.6], atol=1.0)


def test_composition_of_water() -> None:
    water = elements.from_atoms({"H": 2, "O": 1})
    assert water.sum() == pytest.approx(1.0)
    assert water[0] == pytest.approx(0.1119, abs=1e-4)


@pytest.mark.parametrize("symbol", ["Xx", "fe", "", "D"])
def test_unknown_symbols_are_refused(symbol: str) -> None:
    with pytest.raises(InputError, match="not an element symbol"):
        elements.atomic_number(symbol)


def test_wrong_compositions_are_refused() -> None:
    with pytest.raises(InputError, match="last axis"):
        elements.as_compositions(np.ones(5))
    with pytest.raises(InputError, match="negative"):
        elements.as_compositions(np.full(ELEMENT_COUNT, -1.0))
    with pytest.raises(InputError, match="negative"):
        elements.as_compositions(np.full(ELEMENT_COUNT, np.nan))
    with pytest.raises(InputError, match="positive"):
        elements.from_atoms({})


def test_shared_arrays_cannot_be_changed() -> None:
    with pytest.raises(ValueError, match="read-only"):
        elements.atomic_masses()[0] = 1.0
