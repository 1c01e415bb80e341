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
    if not written:
        return amounts, {}
    if len(written) < 2 or abs(firsts - seconds) > 1e-6:
        return amounts, {n: (min(ends), max(ends)) for n, ends in written.items()}
    shared = next(iter(written))

    def together(values: Values) -> dict[str, float]:
        share = values[shared]
        ends = {n: first + share * (last - first) for n, (first, last) in written.items()}
        return amounts({**values, **ends})

    return together, {shared: (0.0, 1.0)}


class Fixed:
    """Amounts that depend on nothing, worked out once."""

    def __init__(self, counts: dict[str, float]) -> None:
        self.counts = counts

    def __call__(self, values: Values) -> dict[str, float]:
        return self.counts


nothing = Fixed({})


def times(amounts: Amounts, amount: Amount | None) -> Amounts:
    """Amounts multiplied by an amount; None for none written."""
    if amount is None:
        return amounts
    if isinstance(amounts, Fixed) and not amount.variables:
        factor = amount.value({})
        return Fixed({symbol: factor * count for symbol, count in amounts.counts.items()})

    def scaled(values: Values) -> dict[str, float]:
        factor = amount.value(values)
        return {symbol: factor * count for symbol, count in amounts(values).items()}

    return scaled


def summed(parts: list[Amounts]) -> Amounts:
    """Amounts added up; those that depend on nothing are added now."""
    if len(parts) == 1:
        return parts[0]
    constant: dict[str, float] = {}
    varying = []
    for part in parts:
        if isinstance(part, Fixed):
            for symbol, count in part.counts.items():
                constant[symbol] = constant.get(symbol, 0.0) + count
        else:
            varying.append(part)
    if not varying:
        return Fixed(constant)

    def total(values: Values) -> dict[str, float]:
        found = dict(constant)
        for part in varying:
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
