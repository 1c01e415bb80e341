"""Ranges of variables: as written behind a formula, or what its amounts allow."""

from __future__ import annotations

import re
from collections.abc import Sequence

from phaseid.phases.amounts import Amount, FormulaError

Range = tuple[float, float]

DEFAULT_RANGE: Range = (0.0, 1.0)
_LARGEST = 1e6

_N = r"(\d*\.?\d+)"
_IS = r"\s*(?:=|≈|~|≃|:)\s*"
_BELOW = r"\s*[<≤]=?\s*"
_V = r"([a-zδ])"
_ABOUT = r"(?:about|ca\.?|up to|~|≈)?\s*"
_CLAUSES: tuple[tuple[str, str], ...] = (
    ("between", rf"{_N}{_BELOW}{_V}{_BELOW}{_N}"),
    ("range", rf"{_V}{_IS}{_N}\s*(?:-|–|—|to|\.\.\.?)\s*{_N}"),
    ("range", rf"{_V}{_IS}\[\s*{_N}\s*,\s*{_N}\s*\]"),
    ("value", rf"{_V}{_IS}{_ABOUT}{_N}"),
    ("below", rf"{_V}{_BELOW}{_N}"),
)
_CLAUSE = "(?:" + "|".join(re.sub(r"\((?!\?)", "(?:", p) for _, p in _CLAUSES) + ")"
_SEPARATOR = r"\s*(?:[,;]|and|with)\s*"
_BEHIND = re.compile(
    rf"(?:\s*[,;]\s*|\s+|(?=[(\[]))(?:(?:where|with|for)\s+)?[(\[]?\s*(?:where|with|for)?\s*"
    rf"({_CLAUSE}(?:{_SEPARATOR}{_CLAUSE})*)\s*[)\]]?\s*$"
)


def without_conditions(text: str) -> tuple[str, dict[str, Range]]:
    """Take conditions such as ``(x = 0-0.17)``, ``(0 < x < 0.4)`` or ``; x = 0-1, y < 0.2`` off a formula.

    Parameters
    ----------
    text : str

    Returns
    -------
    body : str
    ranges : dict of str to (float, float)
    """
    found = _BEHIND.search(text)
    if not found:
        return text.rstrip(), {}
    ranges: dict[str, Range] = {}
    for clause in re.finditer(_CLAUSE, found[1]):
        name, ends = _clause(clause[0])
        if ends[0] > ends[1]:
            raise FormulaError(
                f"{text!r}: the range of {name} runs from {ends[0]:g} to {ends[1]:g}; give the lower "
                "end first."
            )
        # The letter that spelling gives to delta.
        ranges[name.replace("δ", "w")] = ends
    return text[: found.start()].rstrip(), ranges


def _clause(text: str) -> tuple[str, Range]:
    for kind, pattern in _CLAUSES:
        found = re.fullmatch(pattern, text)
        if not found:
            continue
        parts = found.groups()
        if kind == "between":
            return parts[1], (float(parts[0]), float(parts[2]))
        if kind == "range":
            return parts[0], (float(parts[1]), float(parts[2]))
        if kind == "value":
            return parts[0], (float(parts[1]), float(parts[1]))
        return parts[0], (0.0, float(parts[1]))
    raise FormulaError(f"{text!r} is no range; write for example (x = 0-0.2).")


def usual_range(name: str, counts: Sequence[Amount]) -> Range:
    """Range of a variable that is given none.

    Parameters
    ----------
    name : str
    counts : sequence of Amount
        All amounts of the formula that hold variables.

    Returns
    -------
    (float, float)
        Where the variable exchanges one thing for another (``Pb6-3xBi2+x``): all values that leave no
        amount negative. Otherwise 0 to 1, or to the value at which an amount vanishes, if that is less.
    """
    rising, roots = False, []
    for amount in counts:
        if name not in amount.variables:
            continue
        others = dict.fromkeys(amount.variables, 0.0)
        try:
            start, one, two = (amount.value({**others, name: v}) for v in (0.0, 1.0, 2.0))
        except FormulaError:
            return DEFAULT_RANGE
        slope = one - start
        if abs((two - one) - slope) > 1e-9 or start < 0:
            return DEFAULT_RANGE
        rising = rising or slope > 0
        if slope < 0:
            roots.append(-start / slope)
    if not roots:
        return DEFAULT_RANGE
    most = min(roots)
    if not 0 < most < _LARGEST:
        return DEFAULT_RANGE
    return (0.0, most if rising else min(most, DEFAULT_RANGE[1]))
