"""Compositions over the ranges of a formula's variables and unstated splits."""

from __future__ import annotations

import itertools
from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from phaseid.phases.reader import Reading
from phaseid.physics.elements import ELEMENT_COUNT, SYMBOLS, atomic_masses

Floats = NDArray[np.float64]
Ranges = Mapping[str, tuple[float, float]]

# Rounding in 1-x-y must not make a composition impossible.
_TOLERANCE = 1e-9
_POSITION = {symbol: i for i, symbol in enumerate(SYMBOLS)}
_MOST_CORNERS = 512


def points(reading: Reading, ranges: Ranges, wanted: int) -> list[Floats]:
    """Possible compositions spread evenly: midpoints in one dimension, a lattice in more.

    Combinations with a negative amount are impossible and passed over.
    """
    dimensions = len(ranges) + sum(n - 1 for n in reading.splits.values())
    if dimensions == 0 or wanted == 1:
        middle = _composition(reading, _at(reading, ranges, np.full(max(dimensions, 1), 0.5)))
        if middle is not None:
            return [middle]
        wanted = max(wanted, 1)
    found: list[Floats] = []
    for unit in _lattice(dimensions, wanted):
        made = _composition(reading, _at(reading, ranges, unit))
        if made is not None:
            found.append(made)
        if len(found) == wanted:
            break
    return found


def corners(reading: Reading, ranges: Ranges) -> list[Floats]:
    """Possible compositions at the ends of all ranges and with each occupant alone on its site."""
    ends = [[(name, low), (name, high)] for name, (low, high) in ranges.items()]
    alone = [
        [[(f"{s}.{i}", 1.0 if i == j else 0.0) for i in range(n)] for j in range(n)]
        for s, n in reading.splits.items()
    ]
    found = []
    choices = itertools.product(*[[[e] for e in pair] for pair in ends], *alone)
    for choice in itertools.islice(choices, _MOST_CORNERS):
        values = dict(itertools.chain.from_iterable(choice))
        made = _composition(reading, values)
        if made is not None:
            found.append(made)
    return found


def _lattice(dimensions: int, wanted: int) -> Floats:
    """Points in the unit cube; more than wanted, as some may be impossible."""
    if dimensions <= 1:
        return ((np.arange(wanted) + 0.5) / wanted)[:, None]
    ratio = 1.5
    for _ in range(40):
        ratio = (1.0 + ratio) ** (1.0 / (dimensions + 1))
    steps = ratio ** -np.arange(1, dimensions + 1)
    unit: Floats = np.mod(0.5 + np.outer(np.arange(60 * wanted), steps), 1.0)
    return unit


def _at(reading: Reading, ranges: Ranges, unit: Floats) -> dict[str, float]:
    """Values of all variables and splits at a point of the unit cube."""
    values: dict[str, float] = {}
    position = 0
    for name, (low, high) in ranges.items():
        values[name] = low + (high - low) * float(unit[position])
        position += 1
    for name, count in reading.splits.items():
        part = unit[position : position + count - 1]
        position += count - 1
        if np.all(part == 0.5):
            shares = np.full(count, 1.0 / count)
        else:
            # Gaps between sorted uniform numbers are uniform on the simplex (Devroye 1986).
            shares = np.diff(np.concatenate([[0.0], np.sort(part), [1.0]]))
        values.update({f"{name}.{i}": float(s) for i, s in enumerate(shares)})
    return values


def _composition(reading: Reading, values: Mapping[str, float]) -> Floats | None:
    """Mass fractions, or None where an amount is negative or nothing is left."""
    row = np.zeros(ELEMENT_COUNT)
    for symbol, amount in reading.amounts(values).items():
        row[_POSITION[symbol]] += amount
    if row.min() < -_TOLERANCE or not np.isfinite(row).all():
        return None
    row = np.maximum(row, 0.0)
    if not reading.by_mass:
        row = row * atomic_masses()
    total = row.sum()
    return row / total if total > 0 else None
