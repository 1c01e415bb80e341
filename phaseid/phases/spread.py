"""Compositions over the ranges of a formula's variables and unstated splits."""

from __future__ import annotations

import itertools
import math
from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from phaseid.phases.reader import Reading
from phaseid.physics.elements import ELEMENT_COUNT, SYMBOLS, atomic_masses

Floats = NDArray[np.float64]
Ranges = Mapping[str, tuple[float, float]]
Factors = list[list[dict[str, float]]]

# Rounding in 1-x-y must not make a composition impossible.
_TOLERANCE = 1e-9
_POSITION = {symbol: i for i, symbol in enumerate(SYMBOLS)}
_MOST_CORNERS = 512
_HALVINGS = 24


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
    """Possible compositions at the ends of all ranges and with each occupant alone on its site.

    Where an end is impossible because an amount would be negative (``Fe{1-x-y}`` with both large), the
    last possible composition on the way to it counts instead. Of very many corners a part is taken,
    the lightest and the heaviest among them.
    """
    factors: list[list[dict[str, float]]] = [
        [{name: end} for end in dict.fromkeys(ends)] for name, ends in ranges.items()
    ]
    factors += [
        [{f"{s}.{i}": float(i == j) for i in range(n)} for j in range(n)]
        for s, n in reading.splits.items()
    ]
    found: list[Floats] = []
    for choice in _choices(reading, factors):
        made = _composition(reading, _joined(factors, choice))
        if made is not None:
            found.append(made)
        else:
            found += _borders(reading, factors, choice)
    return list({row.round(6).tobytes(): row for row in found}.values())


def _joined(factors: Factors, choice: Sequence[int]) -> dict[str, float]:
    return {k: v for f, c in zip(factors, choice, strict=True) for k, v in f[c].items()}


def _choices(reading: Reading, factors: Factors) -> list[tuple[int, ...]]:
    sizes = [len(f) for f in factors]
    if math.prod(sizes) <= _MOST_CORNERS:
        return list(itertools.product(*map(range, sizes)))
    lightest, heaviest = _by_weight(reading, factors)
    drawn = np.random.default_rng(0).integers(0, sizes, (_MOST_CORNERS - 2, len(sizes)))
    chosen = [lightest, heaviest, *(tuple(int(c) for c in row) for row in drawn)]
    return list(dict.fromkeys(chosen))


def _by_weight(reading: Reading, factors: Factors) -> tuple[tuple[int, ...], tuple[int, ...]]:
    """Corners that look lightest and heaviest when each factor is tried by itself."""
    least, most = [], []
    start = [0] * len(factors)
    numbers = np.arange(1, ELEMENT_COUNT + 1)
    for at, factor in enumerate(factors):
        means = []
        for c in range(len(factor)):
            row = _composition(reading, _joined(factors, [*start[:at], c, *start[at + 1 :]]))
            means.append(0.0 if row is None else float(row @ numbers))
        least.append(int(np.argmin(means)))
        most.append(int(np.argmax(means)))
    return tuple(least), tuple(most)


def _borders(reading: Reading, factors: Factors, choice: Sequence[int]) -> list[Floats]:
    """Last possible compositions on the edges that lead to an impossible corner."""
    found = []
    there = _joined(factors, choice)
    for at, factor in enumerate(factors):
        for c in range(len(factor)):
            if c == choice[at]:
                continue
            here = _joined(factors, [*choice[:at], c, *choice[at + 1 :]])
            best = _composition(reading, here)
            if best is None:
                continue
            low, high = 0.0, 1.0
            for _ in range(_HALVINGS):
                middle = (low + high) / 2
                made = _composition(
                    reading, {k: v + middle * (there[k] - v) for k, v in here.items()}
                )
                low, high = (low, middle) if made is None else (middle, high)
                best = best if made is None else made
            found.append(best)
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
