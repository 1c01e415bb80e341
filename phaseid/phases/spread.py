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
_MOST_CORNERS = 128
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
    found: list[Floats] = []
    # More are tried only where some are impossible.
    for tried in (wanted, 60 * wanted):
        lattice = _lattice(dimensions, wanted if dimensions <= 1 else tried)
        rows = _compositions(reading, [_at(reading, ranges, unit) for unit in lattice])
        found = [row for row in rows if row is not None][:wanted]
        if len(found) == wanted or dimensions <= 1:
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
    choices = _choices(reading, factors)
    found: list[Floats] = []
    rows = _compositions(reading, [_joined(factors, choice) for choice in choices])
    for choice, made in zip(choices, rows, strict=True):
        found += _borders(reading, factors, choice) if made is None else [made]
    return list({row.round(6).tobytes(): row for row in found}.values())


def _joined(factors: Factors, choice: Sequence[int]) -> dict[str, float]:
    return {k: v for f, c in zip(factors, choice, strict=True) for k, v in f[c].items()}


def _choices(reading: Reading, factors: Factors) -> list[tuple[int, ...]]:
    sizes = [len(f) for f in factors]
    if math.prod(sizes) <= _MOST_CORNERS:
        return list(itertools.product(*map(range, sizes)))
    chosen = list(_by_weight(reading, factors))
    # One against all others: most of one element is where the others are at their least.
    for at, size in enumerate(sizes):
        for c in range(size):
            for others in ([0] * len(sizes), [n - 1 for n in sizes]):
                chosen.append((*others[:at], c, *others[at + 1 :]))
    drawn = np.random.default_rng(0).integers(0, sizes, (_MOST_CORNERS, len(sizes)))
    chosen += [tuple(int(c) for c in row) for row in drawn]
    return list(dict.fromkeys(chosen))[:_MOST_CORNERS]


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


def _lattice(dimensions: int, count: int) -> Floats:
    """Points spread evenly in the unit cube (additive recurrence, Roberts 2018, from memory)."""
    if dimensions <= 1:
        return ((np.arange(count) + 0.5) / count)[:, None]
    ratio = 1.5
    for _ in range(40):
        ratio = (1.0 + ratio) ** (1.0 / (dimensions + 1))
    steps = ratio ** -np.arange(1, dimensions + 1)
    unit: Floats = np.mod(0.5 + np.outer(np.arange(count), steps), 1.0)
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
    return _compositions(reading, [values])[0]


def _compositions(reading: Reading, values: Sequence[Mapping[str, float]]) -> list[Floats | None]:
    """Mass fractions, or None where an amount is negative or nothing is left."""
    rows = np.zeros((len(values), ELEMENT_COUNT))
    for row, one in zip(rows, values, strict=True):
        for symbol, amount in reading.amounts(one).items():
            row[_POSITION[symbol]] += amount
    possible = (rows.min(axis=1) >= -_TOLERANCE) & np.isfinite(rows).all(axis=1)
    rows = np.maximum(rows, 0.0)
    if not reading.by_mass:
        rows = rows * atomic_masses()
    total = rows.sum(axis=1)
    possible &= total > 0
    rows[possible] /= total[possible, None]
    return [row if ok else None for row, ok in zip(rows, possible, strict=True)]
