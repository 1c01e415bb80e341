"""Mean atomic number of a composition, by each published definition.

All definitions are ratios of sums over elements, so a whole table of phases is a matrix product.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from phaseid.errors import InputError
from phaseid.physics.elements import Floats, as_compositions, atomic_masses, atomic_numbers

DEFAULT_EXPONENT = 0.7


@dataclass(frozen=True)
class AveragingMethod:
    """One published definition of the mean atomic number.

    Attributes
    ----------
    name : str
        What `mean_atomic_number` takes as `method`.
    formula : str
        With c the mass and a the atomic fractions.
    source : str
        Literature name and year.
    note : str
        Where it is known to do well or badly.
    mean : callable
        ``mean(mass_fractions, exponent) -> array`` without the last axis.
    """

    name: str
    formula: str
    source: str
    note: str
    mean: Callable[[Floats, float], Floats]


def mean_atomic_number(
    mass_fractions: ArrayLike, method: str = "mass", *, exponent: float = DEFAULT_EXPONENT
) -> Floats:
    """Mean atomic number.

    Parameters
    ----------
    mass_fractions : array_like of shape (..., 103)
    method : str
        One of the names of `averaging_methods`.
    exponent : float
        Only for ``"z-fraction"``: the power of Z that weights an atom. 0.7 fits compounds of
        moderate atomic number and 0.8 Au-Cu-Ag alloys (as stated by a university microprobe
        laboratory).

    Returns
    -------
    ndarray of shape (...)
        nan for an empty composition.

    Raises
    ------
    InputError
        For an unknown method.
    """
    for candidate in averaging_methods():
        if candidate.name == method:
            return candidate.mean(as_compositions(mass_fractions), exponent)
    known = ", ".join(candidate.name for candidate in averaging_methods())
    raise InputError(f"There is no averaging method {method!r}; choose one of {known}.")


def atomic_fractions(mass_fractions: ArrayLike) -> Floats:
    """Fraction of the atoms that each element has, shape (..., 103)."""
    moles = as_compositions(mass_fractions) / atomic_masses()
    fractions: Floats = moles / moles.sum(axis=-1, keepdims=True)
    return fractions


def averaging_methods() -> tuple[AveragingMethod, ...]:
    """Every definition that ships, in a fixed order."""
    return (
        AveragingMethod(
            "mass",
            "sum c Z",
            "Muller 1954",
            "The usual handbook value; as the argument of eta(Z) it overestimates compounds of "
            "light and heavy elements.",
            lambda c, _: _ratio(c, atomic_numbers(), np.ones(len(atomic_numbers()))),
        ),
        AveragingMethod(
            "electron",
            "sum a Z^2 / sum a Z",
            "Saldick & Allen 1954; the electron fraction of Donovan et al. 2003",
            "Independent of isotopic mass.",
            lambda c, _: _by_atoms(c, 1.0),
        ),
        AveragingMethod(
            "root-mean-square",
            "sqrt(sum a Z^2)",
            "Joyet 1953; Hohn & Niedrig 1972; Buchner 1973",
            "Counts every hydrogen atom in full, so hydrous phases come out far too light.",
            _root_mean_square,
        ),
        AveragingMethod(
            "everhart",
            "sum c Z^2 / sum c Z",
            "Everhart 1960",
            "Above the mass average wherever light and heavy elements meet.",
            lambda c, _: _ratio(c, atomic_numbers() ** 2, atomic_numbers()),
        ),
        AveragingMethod(
            "z-fraction",
            "sum a Z^(x+1) / sum a Z^x",
            "Donovan et al. 2023 (Z fraction), x = 0.7 unless stated",
            "The exponent belongs in this mean, not in weights applied to eta.",
            _by_atoms,
        ),
    )


def _ratio(mass_fractions: Floats, above: Floats, below: Floats) -> Floats:
    numerator, denominator = mass_fractions @ above, mass_fractions @ below
    unknown = np.full(np.shape(denominator), np.nan)
    ratio: Floats = np.divide(numerator, denominator, out=unknown, where=denominator > 0)
    return ratio


def _by_atoms(mass_fractions: Floats, exponent: float) -> Floats:
    weight = atomic_numbers() ** exponent / atomic_masses()
    return _ratio(mass_fractions, weight * atomic_numbers(), weight)


def _root_mean_square(mass_fractions: Floats, _: float) -> Floats:
    per_mass = 1.0 / atomic_masses()
    return np.sqrt(_ratio(mass_fractions, per_mass * atomic_numbers() ** 2, per_mass))
