"""Reading formula text into a sum of element amounts."""

from __future__ import annotations

import re
from dataclasses import dataclass, field

from phaseid.phases.amounts import (
    VARIABLE_LETTERS,
    Amount,
    FormulaError,
    Values,
    arithmetic,
    fixed,
    variable,
)
from phaseid.phases.spelling import DOTS, VACANCIES, respelled
from phaseid.phases.sums import Amounts, Fixed, coupled, nothing, scaled_to, summed, times
from phaseid.physics.elements import SYMBOLS

_KNOWN = frozenset(SYMBOLS)
_HYDROGEN = ("D",)
_NUMBER = r"(?:\d+(?:\.\d+)?|\.\d+)"
_LETTER = f"[{VARIABLE_LETTERS}]"
_TERM = f"(?:{_NUMBER}?{_LETTER}|{_NUMBER})"
_OPENING_AMOUNT = frozenset("0123456789." + VARIABLE_LETTERS)
_GENERIC = {
    "HREE": "(Y,Dy,Yb)",
    "LREE": "(La,Ce,Nd)",
    "REE": "(Ce0.5La0.25Nd0.25)",
    "RE": "(Ce0.5La0.25Nd0.25)",
    "Ln": "(La,Ce,Nd)",
    "Me": "(Fe,Mn)",
    "TM": "(Fe,Ni)",
    "M": "(Fe,Mg)",
    "R": "(Ce,Y)",
    "A": "(Na,K)",
    "X": "(F,Cl)",
}
_ANIONS = frozenset({"N", "P", "As", "Sb", "O", "S", "Se", "Te", "F", "Cl", "Br", "I", "C"})
_DEEPEST = 40


@dataclass
class Reading:
    """A formula as read.

    Attributes
    ----------
    amounts : callable
        Atoms of each element for given values of the variables and splits.
    elements : frozenset of str
    variables : set of str
        Named variables.
    ranges : dict of str to (float, float)
        Variables that come with a range in the text.
    splits : dict of str to int
        Site groups with an unstated split, and the number of their occupants; the shares of split s
        are the values ``s.0``, ``s.1`` and so on.
    by_mass : bool
        Whether `amounts` are mass shares instead of atoms.
    counts : tuple of Amount
        Amounts that hold variables; none of them can be negative.
    """

    amounts: Amounts
    elements: frozenset[str]
    variables: set[str] = field(default_factory=set)
    ranges: dict[str, tuple[float, float]] = field(default_factory=dict)
    splits: dict[str, int] = field(default_factory=dict)
    by_mass: bool = False
    counts: tuple[Amount, ...] = ()


def read_formula(text: str) -> Reading:
    """Read a formula without mixtures.

    Raises
    ------
    FormulaError
    """
    return _Reader(text).read()


@dataclass
class _Part:
    """Something with an amount: an element, a bracket, a site."""

    amounts: Amounts
    amount: Amount | None


class _Reader:
    def __init__(self, text: str) -> None:
        self.original = text
        spelled = respelled(text)
        self.text, self.positions = spelled.text, spelled.positions
        self.at = self.depth = 0
        self.elements: set[str] = set()
        self.variables: set[str] = set()
        self.ranges: dict[str, tuple[float, float]] = {}
        self.splits: dict[str, int] = {}
        self.counts: list[Amount] = []
        self.written: dict[str, tuple[float, float]] = {}
        self.charged = bool(re.search(r"[A-Za-z]\d\+", self.text))

    # --- errors ---

    def error(self, what: str, remedy: str, at: int | None = None) -> FormulaError:
        where = self.where(self.at if at is None else at)
        return FormulaError(f"{where}: {what}; {remedy}.")

    def where(self, at: int) -> str:
        return f"{self.original!r}, character {self.positions[min(at, len(self.text))] + 1}"

    # --- the grammar, from the whole to the parts ---

    def read(self) -> Reading:
        joined = re.search(r"\s\+\s", self.original)
        if joined:
            where = f"{self.original!r}, character {joined.start() + 2}"
            raise FormulaError(
                f"{where}: '+' joins substances, not amounts; write one composition with dots, or wt%."
            )
        parts = []
        while True:
            factor = self._multiplier()
            parts.append(times(self._sequence(""), factor))
            if self.at >= len(self.text):
                break
            character = self.text[self.at]
            if character in DOTS or (character == "." and self.at + 1 < len(self.text)):
                self.at += 1
                continue
            if character in ")]":
                raise self.error(f"{character!r} closes nothing", "remove it or open the bracket")
            if character == "-":
                raise self.error(
                    "'-' joins names, not amounts",
                    "write a composition with dots, such as Na2O·CaO·6SiO2, or as wt% with amounts",
                )
            if character == ",":
                raise self.error(
                    "',' separates the occupants of a site", "put the site in brackets: (Mg,Fe)"
                )
            raise self.error(f"{character!r} is not expected here", "remove it")
        if not self.elements:
            raise self.error("there is no element in it", "write for example Fe3C", 0)
        named = self.variables - set(self.ranges)
        amounts, ranges = coupled(summed(parts), self.written)
        return Reading(
            amounts,
            frozenset(self.elements),
            named,
            ranges,
            self.splits,
            counts=tuple(self.counts),
        )

    def _multiplier(self) -> Amount | None:
        """A number, range, or variable before a part: 3Al2O3, 2[...], 17-18H2O, nH2O, {n}H2O."""
        rest = self.text[self.at :]
        if rest.startswith("{"):
            return self._braces()
        if rest[:1] not in _OPENING_AMOUNT:
            return None
        found = re.match(rf"({_NUMBER})-({_NUMBER})(?=[A-Z(\[])", rest)
        if found:
            self.at += found.end()
            return self._range(float(found[1]), float(found[2]))
        plain = self._fraction(r"(?=[A-Z(\[])") or self._number(rf"(?=[A-Z(\[{VACANCIES}])")
        if plain is not None:
            return plain
        found = re.match(rf"({_NUMBER}?{_LETTER})(?=[A-Z(\[])", rest)
        if found:
            self.at += found.end()
            return self._named(found[1])
        return None

    def _sequence(self, closing: str) -> Amounts:
        parts = []
        while self.at < len(self.text):
            character = self.text[self.at]
            if character in closing or character in ",)]-" or self._is_dot():
                break
            parts.append(self._item())
        return summed([times(p.amounts, p.amount) for p in parts])

    def _is_dot(self) -> bool:
        character = self.text[self.at]
        # A dot between digits belongs to a number and is taken with it, so it never shows up here.
        return character in DOTS or character == "."

    def _item(self) -> _Part:
        character = self.text[self.at]
        if character in "([":
            return self._bracket()
        if character in VACANCIES:
            self.at += 1
            self._amount("")
            return _Part(nothing, None)
        found = re.match(r"Vac(?![a-z])", self.text[self.at :])
        if found:
            self.at += 3
            self._amount("")
            return _Part(nothing, None)
        symbol = self._symbol()
        self.elements.add(symbol)
        return _Part(Fixed({symbol: 1.0}), self._amount(symbol))

    def _symbol(self) -> str:
        rest = self.text[self.at :]
        for generic, example in _GENERIC.items():
            if rest.startswith(generic) and not rest[len(generic) : len(generic) + 1].islower():
                raise self.error(
                    f"{generic} stands for several elements",
                    f"name them, for example {example}",
                )
        if rest.startswith("SI") and self.text.isupper():
            raise self.error("'SI' is sulphur and iodine", "write Si for silicon")
        roman = re.match(r"(?:I|V)\)", rest)
        if roman and re.search(r"[a-z]\($", self.text[: self.at]):
            raise self.error(
                "an oxidation number and an element look alike here", "leave the number out"
            )
        two, one = rest[:2], rest[:1]
        if len(two) == 2 and two[1].islower() and two in _KNOWN:
            self.at += 2
            return two
        if one in _KNOWN:
            following = rest[1:2]
            if following.islower() and following not in VARIABLE_LETTERS:
                raise self.error(
                    f"{two!r} is no element", "check the symbol: first letter large, second small"
                )
            self.at += 1
            return one
        if one in _HYDROGEN and not rest[1:2].islower():
            self.at += 1
            return "H"
        shown = re.match(r"[A-Z][a-z]?|.", rest)
        raise self.error(
            f"{shown[0] if shown else rest!r} is no element",
            "check the symbol: first letter large, second small",
        )

    def _bracket(self) -> _Part:
        start = self.at
        opening = self.text[self.at]
        closing = ")" if opening == "(" else "]"
        self.at += 1
        self.depth += 1
        if self.depth > _DEEPEST:
            raise self.error("brackets are nested too deeply", "write it with fewer brackets")
        if self.text[self.at : self.at + 1] == closing:
            # An empty square bracket is the usual way to type a vacancy.
            self.at += 1
            self.depth -= 1
            self._amount("")
            return _Part(nothing, None)
        occupants = [self._occupant(closing)]
        while self.text[self.at : self.at + 1] == ",":
            self.at += 1
            occupants.append(self._occupant(closing))
        if self.at >= len(self.text):
            raise self.error(f"{opening!r} is never closed", f"add {closing!r}", start)
        if self.text[self.at] != closing:
            raise self.error(
                f"{self.text[self.at]!r} does not close {opening!r}", f"write {closing!r}"
            )
        self.at += 1
        self.depth -= 1
        inner = self._site(occupants)
        total = self._site_total()
        if total is not None:
            return _Part(scaled_to(inner, total), None)
        return _Part(inner, self._amount(")"))

    def _occupant(self, closing: str) -> tuple[Amounts, bool]:
        """One occupant of a site, and whether its share is written with it."""
        parts: list[Amounts] = []
        first = self.at
        last_amount: list[Amount | None] = []
        while True:
            factor = self._multiplier()
            items = []
            while self.at < len(self.text):
                character = self.text[self.at]
                if character in ",)]-" or self._is_dot():
                    break
                items.append(self._item())
            parts.append(times(summed([times(p.amounts, p.amount) for p in items]), factor))
            last_amount += [p.amount for p in items]
            if self.at < len(self.text) and self._is_dot():
                self.at += 1
                continue
            break
        if self.at == first:
            raise self.error("an occupant is missing", "name it or remove the comma")
        if self.text[self.at : self.at + 1] == "-":
            raise self.error("'-' is not expected in a bracket", "separate occupants with commas")
        stated = len(last_amount) == 1 and last_amount[0] is not None
        return summed(parts), stated

    def _site(self, occupants: list[tuple[Amounts, bool]]) -> Amounts:
        if len(occupants) == 1:
            return occupants[0][0]
        if all(stated for _, stated in occupants):
            return summed([amounts for amounts, _ in occupants])
        name = f"site {len(self.splits) + 1}"
        self.splits[name] = len(occupants)
        every = [amounts for amounts, _ in occupants]

        def split(values: Values) -> dict[str, float]:
            total: dict[str, float] = {}
            for n, amounts in enumerate(every):
                share = values[f"{name}.{n}"]
                for symbol, count in amounts(values).items():
                    total[symbol] = total.get(symbol, 0.0) + share * count
            return total

        return split

    def _site_total(self) -> float | None:
        found = re.match(rf"Σ=?({_NUMBER})", self.text[self.at :])
        if not found:
            return None
        self.at += found.end()
        return float(found[1])

    # --- amounts and charges ---

    def _amount(self, symbol: str) -> Amount | None:
        """Charge and amount after an element or a bracket; None where nothing is written."""
        self._charge(symbol)
        rest = self.text[self.at :]
        if rest.startswith("{"):
            return self._braces()
        if rest[:1] not in _OPENING_AMOUNT and not rest.startswith("("):
            return None
        expression = re.match(rf"(?:(?:{_TERM}[+-])+{_TERM}|{_NUMBER}?{_LETTER})(?![a-z])", rest)
        if expression and re.search(_LETTER, expression[0]):
            self.at += expression.end()
            return self._named(expression[0])
        found = re.match(rf"\((?=[^A-Z]*{_LETTER})([^A-Z()]+)\)", rest)
        if found:
            amount = self._named(found[1])
            self.at += found.end()
            return amount
        found = re.match(rf"({_NUMBER})-({_NUMBER})(?![+\d])", rest)
        if found:
            self.at += found.end()
            return self._range(float(found[1]), float(found[2]))
        return self._fraction("") or self._number("")

    def _fraction(self, before: str) -> Amount | None:
        found = re.match(rf"(\d+)/(\d+){before}", self.text[self.at :])
        if not found or int(found[2]) == 0:
            return None
        self.at += found.end()
        return fixed(int(found[1]) / int(found[2]))

    def _number(self, before: str) -> Amount | None:
        found = re.match(_NUMBER + before, self.text[self.at :])
        if not found:
            return None
        self.at += found.end()
        return fixed(float(found[0]))

    def _charge(self, symbol: str) -> None:
        rest = self.text[self.at :]
        if "+" not in rest[:2] and "-" not in rest[:2]:
            return
        repeated = re.match(r"\+{2,4}|--", rest)
        if repeated:
            self.at += repeated.end()
            return
        if re.match(rf"\d?[+]{_LETTER}(?![a-z])", rest):
            return  # 2+x is an amount
        found = re.match(r"\d?\+(?!\+)", rest)
        if found:
            self.at += found.end()
            return
        if re.match(rf"\d-{_NUMBER}?{_LETTER}(?![a-z])", rest):
            return  # 6-3x is an amount
        found = re.match(r"\d?-(?![\d.])", rest)
        joins = re.match(r"\d?-[A-Z(\[]", rest)
        if found and not (joins and not self.charged):
            self.at += found.end()
            return
        found = re.match(r"\d?-(?=\d)", rest)
        if found and symbol in (*_ANIONS, ")") and self.charged:
            self.at += found.end()

    def _braces(self) -> Amount:
        end = self.text.find("}", self.at)
        if end < 0:
            raise self.error("'{' is never closed", "add '}'")
        amount = self._named(self.text[self.at + 1 : end])
        self.at = end + 1
        return amount

    def _named(self, text: str) -> Amount:
        found = re.fullmatch(rf"({_NUMBER})-({_NUMBER})", text)
        if found:
            return self._range(float(found[1]), float(found[2]))
        amount = arithmetic(text, self.where(self.at))
        self.variables |= amount.variables
        self.counts.append(amount)
        return amount

    def _range(self, first: float, second: float) -> Amount:
        name = f"range {len(self.ranges) + 1}"
        self.ranges[name] = (min(first, second), max(first, second))
        self.written[name] = (first, second)
        return variable(name)
