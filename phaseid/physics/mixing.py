"""Compound rules: from the elements' backscatter coefficients to that of a compound.

Two families exist. *Weighted sums* add the elements' eta with a weight per element; *means* put one
mean atomic number into eta(Z). A mean is only as good as its average: eta(Z) bends downwards, so a
mean atomic number pulled up by a few heavy atoms (by mass, or Everhart's) gives compounds of light
and heavy elements 5-15 % too much. The exponent 0.7 of the Z fraction belongs in a mean. Used as
weights on eta it gives 10 % rms and up to 25 % too little, so that combination is not offered.

Which rules are *defensible*
----------------------------
Deviations from single-scattering simulations at 20 keV, with eta of the elements simulated too: of
26 compounds by an independent program (first column, worst case in brackets), and of the 16 that
``tests/benchmarks/physics_validation.py`` simulates with this one (second column).

======================  ========================  =====================  =======================
rule                    rms, independent          rms, ours              verdict
======================  ========================  =====================  =======================
mass-fraction           1.6 % (ZrSiO4 -3.9 %)     1.7 % (gypsum +4.7 %)  default
z-fraction-mean         2.5 % (ZrSiO4 -4.9 %)     2.7 % (gypsum -6.1 %)  defensible
electron-fraction       3.4 % (ThSiO4 -8.5 %)     3.0 % (BaSO4 -6.6 %)   defensible
pouchou-mean            --                        4.6 % (PbCO3 +9.5 %)   defensible
elastic-fraction        3.2 % (CaCO3 +6.8 %)      6.0 % (gypsum +12 %)   defensible
electron-mean           4.3 % (ThSiO4 +11 %)      6.7 % (BaSO4 +13 %)    not: curvature bias
mass-mean               5.6 % (BaSO4 +14.5 %)     8.3 % (BaSO4 +17 %)    not: curvature bias
root-mean-square-mean   --                        8.2 % (gypsum -22 %)   not: hydrogen dilutes it
everhart-mean           --                        21 % (ZrSiO4 +39 %)    not
======================  ========================  =====================  =======================

Measurements: Howell, Davy & Boyde 1998 found the mass-fraction sum to agree best; Donovan 2003 found
electron fractions better than mass fractions; Reed 2003 holds the difference to matter only with
heavy elements. The literature disagrees, so the choice is the user's and the spread of the
defensible rules, which err to both sides of the simulation, is an uncertainty.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cache

import numpy as np

from phaseid.errors import InputError
from phaseid.physics.averaging import mean_atomic_number
from phaseid.physics.elements import Floats, atomic_masses, atomic_numbers

DEFAULT_RULE = "mass-fraction"


@dataclass(frozen=True)
class CompoundRule:
    """A rule for compounds.

    Exactly one of `weights` and `mean` is set.

    Attributes
    ----------
    name, formula, source, note : str
    defensible : bool
        Whether it takes part in the spread between rules; see the module's text.
    weights : callable or None
        ``weights(energy_keV) -> (103,)``: weight of each element per unit of mass fraction.
    mean : callable or None
        ``mean(mass_fractions) -> (...)``: the mean atomic number to put into eta(Z).
    """

    name: str
    formula: str
    source: str
    note: str
    defensible: bool
    weights: Callable[[float], Floats] | None = None
    mean: Callable[[Floats], Floats] | None = None


@cache
def compound_rules() -> tuple[CompoundRule, ...]:
    """Every rule that ships, the default first."""
    return (
        CompoundRule(
            "mass-fraction",
            "sum c eta",
            "Castaing 1951; Heinrich 1966",
            "Elements weighted by mass.",
            True,
            weights=lambda _: np.ones(len(atomic_numbers())),
        ),
        CompoundRule(
            "elastic-fraction",
            "sum f eta, f ~ a sigma(Z, E)",
            "Armstrong 1991",
            "Elements weighted by their share of the elastic scattering, screened Rutherford "
            "cross-section; close to a Z^1.33.",
            True,
            weights=lambda energy_keV: rutherford_shape(energy_keV) / atomic_masses(),
        ),
        CompoundRule(
            "electron-fraction",
            "sum f eta, f ~ a Z",
            "Donovan, Pingitore & Westphal 2003",
            "Elements weighted by their share of the electrons.",
            True,
            weights=lambda _: atomic_numbers() / atomic_masses(),
        ),
        CompoundRule(
            "z-fraction-mean",
            "eta(sum a Z^1.7 / sum a Z^0.7)",
            "Donovan et al. 2023",
            "",
            True,
            mean=lambda c: mean_atomic_number(c, "z-fraction"),
        ),
        CompoundRule(
            "pouchou-mean",
            "eta((sum c sqrt Z)^2)",
            "Pouchou & Pichoir 1991",
            "The mean atomic number they use for eta.",
            True,
            mean=lambda c: (c @ np.sqrt(atomic_numbers())) ** 2,
        ),
        CompoundRule(
            "electron-mean",
            "eta(sum a Z^2 / sum a Z)",
            "Saldick & Allen 1954; Donovan et al. 2003",
            "Overestimates compounds of light and heavy elements.",
            False,
            mean=lambda c: mean_atomic_number(c, "electron"),
        ),
        CompoundRule(
            "mass-mean",
            "eta(sum c Z)",
            "Muller 1954",
            "Overestimates compounds of light and heavy elements.",
            False,
            mean=lambda c: mean_atomic_number(c, "mass"),
        ),
        CompoundRule(
            "root-mean-square-mean",
            "eta(sqrt(sum a Z^2))",
            "Joyet 1953; Hohn & Niedrig 1972; Buchner 1973",
            "Fails where there is much hydrogen.",
            False,
            mean=lambda c: mean_atomic_number(c, "root-mean-square"),
        ),
        CompoundRule(
            "everhart-mean",
            "eta(sum c Z^2 / sum c Z)",
            "Everhart 1960",
            "Overestimates compounds of light and heavy elements most.",
            False,
            mean=lambda c: mean_atomic_number(c, "everhart"),
        ),
    )


@cache
def defensible_rules() -> tuple[CompoundRule, ...]:
    """The rules whose spread counts as uncertainty, the default first."""
    return tuple(rule for rule in compound_rules() if rule.defensible)


def get_rule(rule: str | CompoundRule) -> CompoundRule:
    """Look a rule up by name; a rule passes through unchanged.

    Raises
    ------
    InputError
        If there is none of that name.
    """
    if isinstance(rule, CompoundRule):
        return rule
    for candidate in compound_rules():
        if candidate.name == rule:
            return candidate
    known = ", ".join(candidate.name for candidate in compound_rules())
    raise InputError(f"There is no compound rule {rule!r}; choose one of {known}.")


def rutherford_shape(energy_keV: float) -> Floats:
    """Screened Rutherford cross-section of each element up to a common factor, shape (103,).

    ``Z^2 / (alpha (1 + alpha))`` with the screening ``alpha = 3.4e-3 Z^0.67 / E``.

    References
    ----------
    Bishop 1976 and Joy 1995 for the screening, as quoted in later literature.
    """
    z = atomic_numbers()
    alpha = 3.4e-3 * z**0.67 / energy_keV
    shape: Floats = z**2 / (alpha * (1.0 + alpha))
    return shape
