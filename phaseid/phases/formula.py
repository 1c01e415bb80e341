"""Formula text to a distribution of compositions.

People write formulas in many ways. What is read:

* elements, nested ``( )`` and ``[ ]``, decimals, unicode subscripts, vacancies (□, ◻, ☐, [])
* site groups: ``(Mg,Fe)2SiO4`` has an unstated split, so every split is possible;
  ``(Mg0.9,Fe0.1)2SiO4`` and ``(Mg0.9Fe0.1)2SiO4`` state it
* named variables in braces with arithmetic: ``(Mg{x}Fe{1-x})2SiO4``, ``Fe{1-x}S``; without braces where
  the letter is one of n m u v w x y z: ``Fe1-xS``
* ranges as subscripts: ``Mg4.5-2.5``; several whose beginnings and ends have one sum are an exchange; site totals: ``(Sb7As2)Σ=9``
* hydrates and oxide sums with any of the usual dots: ``CaSO4·2H2O``, ``3Al2O3·2SiO2``
* the spellings of `phaseid.phases.spelling`: HTML, LaTeX, carets, fractions, decimal commas
* mixtures: ``wt% Fe74 Cr18 Ni8``, ``wt% SiO2 68-75 Na2O 12-16``, ``at% Ni{100-x} Al{x}``, ``wt% Cr18 Fe bal``,
  and the trade's ``Ti-6Al-4V``, whose first is the balance by weight

A charge and a subscript can look alike. A digit followed by a sign is a charge when something follows that
cannot continue an amount, or when digits follow: ``Sn2+21`` is Sn(2+) times 21, ``Mn3+6`` is Mn(3+) times
6, ``Mo5+6x`` is Mo(5+) times 6x. ``2+x`` and ``6-3x`` are amounts, as nothing but an amount holds a
variable there. ``a-b`` after a symbol is a range, except after an anion in a formula that states charges
elsewhere: ``N3-24`` beside ``Hg2+55`` is N(3-) times 24.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from phaseid.errors import InputError
from phaseid.phases.amounts import FormulaError
from phaseid.phases.mixture import is_mixture, read_mixture
from phaseid.phases.reader import Reading, read_formula
from phaseid.phases.spread import corners, points
from phaseid.phases.variables import usual_range, without_conditions

__all__ = ["Formula", "FormulaError", "parse"]

Floats = NDArray[np.float64]

# Letters that count something without a natural upper limit.
_COUNTS = ("n", "m")
MOST_CHARACTERS = 400


@dataclass(frozen=True)
class Formula:
    """A formula that was understood.

    Attributes
    ----------
    text : str
        As it was written.
    variables : dict of str to (float, float)
        Ranges of the named variables and of unstated splits.
    reading : Reading
    """

    text: str
    variables: dict[str, tuple[float, float]]
    reading: Reading

    @property
    def is_variable(self) -> bool:
        """Whether the formula stands for a range of compositions."""
        return bool(self.variables) or bool(self.reading.splits)

    @property
    def elements(self) -> frozenset[str]:
        """Symbols that can occur."""
        return self.reading.elements

    def mass_fractions(self) -> Floats:
        """Composition in the middle of all ranges, shape (103,)."""
        found, _ = self.variants(1)
        return np.asarray(found[0])

    def variants(self, n_max: int = 9) -> tuple[Floats, Floats]:
        """Compositions spread evenly over the ranges.

        Parameters
        ----------
        n_max : int
            Largest number of compositions; a fixed formula gives one.

        Returns
        -------
        mass_fractions : ndarray of shape (V, 103)
        weights : ndarray of shape (V,)
            Sum to one.

        Raises
        ------
        FormulaError
            If no composition in the ranges is possible.
        """
        rows = points(self.reading, self.variables, n_max if self.is_variable else 1)
        if not rows:
            raise FormulaError(
                f"{self.text!r} has negative amounts over all its ranges; correct the ranges."
            )
        return np.stack(rows), np.full(len(rows), 1.0 / len(rows))

    def extremes(self) -> Floats:
        """Compositions at the possible corners of the ranges, shape (n, 103)."""
        rows = corners(self.reading, self.variables)
        return np.stack(rows) if rows else self.variants()[0]


def parse(text: str, ranges: Mapping[str, tuple[float, float]] | None = None) -> Formula:
    """Read a formula.

    Parameters
    ----------
    text : str
    ranges : mapping of str to (float, float), optional
        Ranges of the variables. A variable without one takes the range that is written behind the
        formula, such as ``(x = 0-0.17)`` or ``(0 < x < 0.4)``, or else `usual_range`.

    Returns
    -------
    Formula

    Raises
    ------
    FormulaError
        One sentence: what is wrong, at which character, and how to write it.
    """
    given = {name: (float(ends[0]), float(ends[1])) for name, ends in (ranges or {}).items()}
    return _parsed(text, tuple(sorted(given.items())))


@lru_cache(maxsize=12_000)
def _parsed(text: str, stated_ranges: tuple[tuple[str, tuple[float, float]], ...]) -> Formula:
    ranges = dict(stated_ranges)
    shown = text if len(text) <= 60 else text[:57] + "..."
    if not text.strip():
        raise FormulaError("The formula is empty; write for example Fe3C or (Mg,Fe)2SiO4.")
    if len(text) > MOST_CHARACTERS:
        raise FormulaError(
            f"The formula {shown!r} has {len(text)} characters; {MOST_CHARACTERS} are the most."
        )
    body, stated = without_conditions(text)
    try:
        reading = read_mixture(body) if is_mixture(body) else read_formula(body)
    except RecursionError:
        raise FormulaError(
            f"{shown!r} is nested too deeply; write it with fewer brackets."
        ) from None
    variables = {**reading.ranges}
    for name in sorted(reading.variables):
        found = ranges.get(name) or stated.get(name)
        if found is None and name in _COUNTS:
            raise FormulaError(
                f"{shown!r}: {name} stands for any number; write its range behind the formula, for "
                f"example ({name} = 1-3), or in a database as ranges: {{{name}: [1, 3]}}."
            )
        low, high = found or usual_range(name, reading.counts)
        if not low <= high or not np.isfinite([low, high]).all():
            raise FormulaError(
                f"{shown!r}: the range of {name} runs from {low} to {high}; give the lower end first."
            )
        variables[name] = (float(low), float(high))
    unused = sorted(set(ranges) - reading.variables)
    if unused:
        raise FormulaError(
            f"{shown!r} has no variable {unused[0]!r}; remove its range or use it in the formula."
        )
    made = Formula(text, variables, reading)
    try:
        made.variants(1)
    except (ZeroDivisionError, OverflowError):
        raise FormulaError(
            f"{shown!r} has amounts that cannot be worked out; correct them."
        ) from None
    except InputError as error:
        raise FormulaError(str(error)) from None
    return made
