"""Elements: symbols, atomic masses, mean ionisation energies.

Compositions throughout the package are arrays whose last axis has length `ELEMENT_COUNT`, index
``Z - 1``, holding mass fractions.
"""

from __future__ import annotations

from functools import cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from phaseid.errors import InputError

Floats = NDArray[np.float64]

# fmt: off
SYMBOLS: tuple[str, ...] = (
    "H", "He", "Li", "Be", "B", "C", "N", "O", "F", "Ne", "Na", "Mg", "Al", "Si", "P", "S", "Cl",
    "Ar", "K", "Ca", "Sc", "Ti", "V", "Cr", "Mn", "Fe", "Co", "Ni", "Cu", "Zn", "Ga", "Ge", "As",
    "Se", "Br", "Kr", "Rb", "Sr", "Y", "Zr", "Nb", "Mo", "Tc", "Ru", "Rh", "Pd", "Ag", "Cd", "In",
    "Sn", "Sb", "Te", "I", "Xe", "Cs", "Ba", "La", "Ce", "Pr", "Nd", "Pm", "Sm", "Eu", "Gd", "Tb",
    "Dy", "Ho", "Er", "Tm", "Yb", "Lu", "Hf", "Ta", "W", "Re", "Os", "Ir", "Pt", "Au", "Hg", "Tl",
    "Pb", "Bi", "Po", "At", "Rn", "Fr", "Ra", "Ac", "Th", "Pa", "U", "Np", "Pu", "Am", "Cm", "Bk",
    "Cf", "Es", "Fm", "Md", "No", "Lr",
)
# fmt: on
ELEMENT_COUNT = 103

_NUMBER_OF = {symbol: number for number, symbol in enumerate(SYMBOLS, start=1)}


def atomic_number(symbol: str) -> int:
    """Atomic number of an element symbol.

    Raises
    ------
    InputError
        If `symbol` is not an element from H to Lr.
    """
    try:
        return _NUMBER_OF[symbol]
    except KeyError:
        raise InputError(
            f"{symbol!r} is not an element symbol; write one of H to Lr with the usual "
            "capital, such as Fe."
        ) from None


@cache
def atomic_numbers() -> Floats:
    """Atomic numbers 1 to 103 as floats, shape (103,), read-only."""
    return _frozen(np.arange(1, ELEMENT_COUNT + 1, dtype=np.float64))


@cache
def atomic_masses() -> Floats:
    """Atomic masses in g/mol, shape (103,), read-only; from pymatgen."""
    from pymatgen.core.periodic_table import Element

    return _frozen(np.array([float(Element(symbol).atomic_mass) for symbol in SYMBOLS]))


@cache
def mean_ionisation_keV() -> Floats:
    """Mean ionisation energy J of each element in keV, shape (103,), read-only.

    ``(9.76 Z + 58.5 Z**-0.19)`` eV for Z >= 13 and ``11.5 Z`` eV below.

    References
    ----------
    Berger & Seltzer 1964 (coefficients as quoted in later Monte Carlo literature; the original was
    not opened).
    """
    z = atomic_numbers()
    return _frozen(np.where(z >= 13, 9.76 * z + 58.5 * z**-0.19, 11.5 * z) * 1e-3)


def pure(symbol: str) -> Floats:
    """Composition of a pure element, shape (103,)."""
    composition = np.zeros(ELEMENT_COUNT)
    composition[atomic_number(symbol) - 1] = 1.0
    return composition


def from_atoms(amounts: dict[str, float]) -> Floats:
    """Composition from numbers of atoms, e.g. ``{"Si": 1, "O": 2}``; shape (103,)."""
    composition = np.zeros(ELEMENT_COUNT)
    for symbol, amount in amounts.items():
        index = atomic_number(symbol) - 1
        composition[index] += amount * atomic_masses()[index]
    total = composition.sum()
    if not total > 0:
        raise InputError("A composition needs at least one element with a positive amount.")
    fractions: Floats = composition / total
    return fractions


def as_compositions(mass_fractions: ArrayLike) -> Floats:
    """Check that `mass_fractions` has a last axis of 103 and return it as float64.

    Raises
    ------
    InputError
        If the last axis is not the elements, or a value is negative or not a number.
    """
    values = np.asarray(mass_fractions, dtype=np.float64)
    if values.ndim == 0 or values.shape[-1] != ELEMENT_COUNT:
        raise InputError(
            f"A composition needs {ELEMENT_COUNT} mass fractions on its last axis, one per "
            f"element; got an array of shape {values.shape}."
        )
    if not np.all(values >= 0):
        raise InputError(
            "A composition holds a negative mass fraction or one that is not a number; "
            "give each element a share between 0 and 1."
        )
    return values


def _frozen(values: Floats) -> Floats:
    values.flags.writeable = False
    return values
