"""Mixtures by weight or atoms: ``wt% Fe74 Cr18 Ni8``, ``wt% SiO2 68-75 Na2O 12-16``, ``at% Ni Al25``."""

from __future__ import annotations

import re

import numpy as np
from numpy.typing import NDArray

from phaseid.phases.amounts import Amount, FormulaError, Values, arithmetic, fixed, variable
from phaseid.phases.reader import Reading, read_formula
from phaseid.phases.sums import Amounts
from phaseid.physics.elements import SYMBOLS, atomic_masses

_UNIT = re.compile(r"(wt|at|mass|mol|weight|atomic)\.?[\s-]*(?:%|pct|per\s?cent)", re.IGNORECASE)
_NUMBER = r"\d+(?:\.\d+)?"
_AMOUNT = rf"(?:\{{[^}}]*\}}|{_NUMBER}(?:\s*[-–]\s*{_NUMBER})?|bal\.?|balance)"
_END = r"(?=[\s,;]|$)"
# A compound is set off from its amount by a space, or the digits could not be told apart; a symbol need
# not be.
_ENTRY = re.compile(
    rf"([A-Z][A-Za-z0-9()\[\].·]*)\s+({_AMOUNT}){_END}|([A-Z][a-z]?)({_AMOUNT}){_END}"
    rf"|(?P<amount>{_NUMBER})\s*(?P<name>[A-Z][a-z]?){_END}"
)
# Fe74Cr18Ni8 in one word, taken as shares only where they make up about a hundred.
_RUN = re.compile(rf"(?:[A-Z][a-z]?{_NUMBER})+{_END}")
_PAIR = re.compile(rf"([A-Z][a-z]?)({_NUMBER})")
# The trade's Ti-6Al-4V: the first is the balance, by weight unless said otherwise.
_ALLOY = re.compile(rf"\s*([A-Z][a-z]?)((?:\s?[-–]\s?{_NUMBER}\s?[A-Z][a-z]?)+)\s*")
_BALANCE = ("bal", "bal.", "balance")


def is_mixture(text: str) -> bool:
    """Whether a text is written as a mixture."""
    return bool(_UNIT.search(text) or _ALLOY.fullmatch(text))


def read_mixture(text: str) -> Reading:
    """Read a mixture; amounts are normalised to 100 %.

    Raises
    ------
    FormulaError
    """
    found = [u[1].lower() for u in _UNIT.finditer(text)]
    kinds = {"w": "wt", "mass": "wt"}
    units = {kinds.get(u, kinds.get(u[0], "at")) for u in found}
    by_mass = units != {"at"}
    if len(units) > 1:
        raise FormulaError(f"{text!r} mixes two kinds of percent; write all amounts in one.")
    reader = _Mixture(text)
    body = _plain(text)
    alloy = _ALLOY.fullmatch(body)
    if alloy:
        reader.add(alloy[1], "bal", alloy.start(1))
        for part in re.finditer(rf"({_NUMBER})\s?([A-Z][a-z]?)", alloy[2]):
            reader.add(part[2], part[1], alloy.start(2) + part.start())
        return reader.finish(by_mass)
    at = 0
    while at < len(body):
        gap = re.match(r"[\s,;]+", body[at:])
        if gap:
            at += gap.end()
            continue
        at = _entry(reader, body, at)
    return reader.finish(by_mass)


def _plain(text: str) -> str:
    """The amounts alone, each in its place: units, signs and an outer bracket become spaces."""
    body = _UNIT.sub(lambda m: " " * len(m[0]), text)
    body = re.sub(r"[%=:]", " ", body)
    body = re.sub(r"(?<=\d),(?=\d)", ".", body).rstrip()
    if body.lstrip().startswith("(") and body.endswith(")") and body.count("(") == 1:
        body = body[:-1].replace("(", " ")
    return body.rstrip()


def _entry(reader: _Mixture, body: str, at: int) -> int:
    """Read the entry that begins at a character; return where it ends."""
    entry = _ENTRY.match(body, at)
    if entry is not None:
        name = entry[1] or entry[3] or entry["name"]
        reader.add(name, entry[2] or entry[4] or entry["amount"], entry.start())
        return entry.end()
    run = _RUN.match(body, at)
    pairs = list(_PAIR.finditer(run[0])) if run else []
    if run and 95 <= sum(float(p[2]) for p in pairs) <= 105:
        for pair in pairs:
            reader.add(pair[1], pair[2], at + pair.start())
        return run.end()
    word = body[at:].split()[0]
    raise FormulaError(
        f"{reader.text!r}, character {at + 1}: {word!r} is not a symbol or compound with an amount; "
        "write for example wt% Fe74 Cr18 Ni8 or wt% SiO2 72 Na2O 14."
    )


class _Mixture:
    def __init__(self, text: str) -> None:
        self.text = text
        self.entries: list[tuple[Amounts, Amount | None]] = []
        self.elements: set[str] = set()
        self.variables: set[str] = set()
        self.ranges: dict[str, tuple[float, float]] = {}
        self.counts: list[Amount] = []

    def add(self, name: str, amount: str, at: int) -> None:
        where = f"{self.text!r}, character {at + 1}"
        try:
            part = read_formula(name)
        except FormulaError:
            raise FormulaError(
                f"{where}: {name!r} is no element or compound; check its spelling, and put a space "
                "between a compound and its amount."
            ) from None
        if part.variables or part.ranges or part.splits:
            raise FormulaError(
                f"{where}: {name!r} has a range of its own; give the parts of a mixture one by one."
            )
        self.elements |= part.elements
        self.entries.append((part.amounts, self._amount(amount, where)))

    def _amount(self, text: str, where: str) -> Amount | None:
        if text in _BALANCE:
            return None
        if text.startswith("{"):
            amount = arithmetic(text[1:-1], where)
            self.variables |= amount.variables
            self.counts.append(amount)
            return amount
        ends = [float(part) for part in re.split(r"\s*[-–]\s*", text)]
        if len(ends) == 1:
            return fixed(ends[0])
        name = f"range {len(self.ranges) + 1}"
        self.ranges[name] = (min(ends), max(ends))
        return variable(name)

    def finish(self, by_mass: bool) -> Reading:
        if not self.entries:
            raise FormulaError(f"{self.text!r} names nothing; write for example wt% Fe74 Cr18 Ni8.")
        if sum(amount is None for _, amount in self.entries) > 1:
            raise FormulaError(f"{self.text!r} has two balances; give all amounts but one.")
        return Reading(
            self._amounts(by_mass),
            frozenset(self.elements),
            self.variables - set(self.ranges),
            self.ranges,
            by_mass=by_mass,
            counts=tuple(self.counts),
        )

    def _amounts(self, by_mass: bool) -> Amounts:
        masses, text = atomic_masses(), self.text
        # Parts have no variables of their own, so what a share of each consists of is fixed.
        entries = [(_shares(part({}), masses, by_mass), amount) for part, amount in self.entries]

        def total(values: Values) -> dict[str, float]:
            shares = [None if a is None else a.value(values) for _, a in entries]
            left = 100.0 - sum(s for s in shares if s is not None)
            if None in shares and left < 0:
                raise FormulaError(
                    f"{text!r} leaves a balance of {left:.4g} %; reduce the amounts."
                )
            found: dict[str, float] = {}
            for (part, _), share in zip(entries, shares, strict=True):
                amount = left if share is None else share
                for symbol, count in part.items():
                    found[symbol] = found.get(symbol, 0.0) + amount * count
            return found

        return total


def _shares(
    atoms: dict[str, float], masses: NDArray[np.float64], by_mass: bool
) -> dict[str, float]:
    """Mass shares of the elements in a part, or its atoms."""
    if not by_mass:
        return atoms
    weighed = {s: n * float(masses[SYMBOLS.index(s)]) for s, n in atoms.items()}
    whole = sum(weighed.values())
    return {s: m / whole for s, m in weighed.items()}
