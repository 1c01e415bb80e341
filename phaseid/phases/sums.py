"""Amounts of elements as functions of the variables, and how they add up."""

from __future__ import annotations

from collections.abc import Callable

from phaseid.phases.amounts import Amount, Values

# Amount of each element for given values of the variables and splits.
Amounts = Callable[[Values], dict[str, float]]


def coupled(
    amounts: Amounts, written: dict[str, tuple[float, float]]
) -> tuple[Amounts, dict[str, tuple[float, float]]]:
    """Ranges whose beginnings and ends have one sum exchange what they count: Mg4.5-2.5 Fe0.5-2.5."""
    firsts, seconds = (sum(ends[i] for ends in written.values()) for i in (0, 1))
    if len(written) < 2 or abs(firsts - seconds) > 1e-6:
        return amounts, {n: (min(ends), max(ends)) for n, ends in written.items()}
    shared = next(iter(written))

    def together(values: Values) -> dict[str, float]:
        share = values[shared]
        ends = {n: first + share * (last - first) for n, (first, last) in written.items()}
        return amounts({**values, **ends})

    return together, {shared: (0.0, 1.0)}


def nothing(values: Values) -> dict[str, float]:
    return {}


def times(amounts: Amounts, amount: Amount | None) -> Amounts:
    if amount is None:
        return amounts

    def scaled(values: Values) -> dict[str, float]:
        factor = amount.value(values)
        return {symbol: factor * count for symbol, count in amounts(values).items()}

    return scaled


def summed(parts: list[Amounts]) -> Amounts:
    if len(parts) == 1:
        return parts[0]

    def total(values: Values) -> dict[str, float]:
        found: dict[str, float] = {}
        for part in parts:
            for symbol, count in part(values).items():
                found[symbol] = found.get(symbol, 0.0) + count
        return found

    return total


def scaled_to(amounts: Amounts, total: float) -> Amounts:
    def scaled(values: Values) -> dict[str, float]:
        found = amounts(values)
        present = sum(found.values())
        return {s: c * total / present for s, c in found.items()} if present else found

    return scaled
