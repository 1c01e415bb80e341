"""Amounts in formulas: numbers, ranges, and arithmetic with variables such as ``1-x`` or ``2*x/3``."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping
from dataclasses import dataclass

from phaseid.errors import InputError

Values = Mapping[str, float]

# Letters that stand for a variable when they follow a symbol without braces.
VARIABLE_LETTERS = "nmuvwxyz"
_TOKEN = re.compile(r"\s*(?:(\d+(?:\.\d+)?|\.\d+)|([A-Za-z_]\w*)|(.))")
_DEEPEST = 30


class FormulaError(InputError):
    """A formula that cannot be read: what is wrong, where, and how to write it."""


@dataclass(frozen=True)
class Amount:
    """An amount that may depend on variables.

    Attributes
    ----------
    value : callable
        From the values of the variables to a number.
    variables : frozenset of str
    """

    value: Callable[[Values], float]
    variables: frozenset[str] = frozenset()

    def scaled(self, factor: float) -> Amount:
        """This amount times a number."""
        return Amount(lambda values: factor * self.value(values), self.variables)


def fixed(number: float) -> Amount:
    """An amount without variables."""
    return Amount(lambda values: number)


def variable(name: str) -> Amount:
    """An amount that is a variable."""
    return Amount(lambda values: values[name], frozenset([name]))


def arithmetic(text: str, where: str) -> Amount:
    """Read arithmetic: + - * /, parentheses, numbers, variables, and a number before a letter (``3x``).

    Parameters
    ----------
    text : str
    where : str
        Beginning of an error message: which formula, which character.

    Returns
    -------
    Amount

    Raises
    ------
    FormulaError
    """
    return _Arithmetic(text, where).read()


class _Arithmetic:
    def __init__(self, text: str, where: str) -> None:
        self.where, self.text = where, text
        self.tokens = [m.groups() for m in _TOKEN.finditer(text.strip())]
        self.at = self.depth = 0

    def read(self) -> Amount:
        amount = self._sum()
        if self.at < len(self.tokens):
            raise self._error()
        return amount

    def _error(self) -> FormulaError:
        return FormulaError(
            f"{self.where}: {self.text!r} is no amount; write for example {{1-x}} or {{2*x/3}}."
        )

    def _peek(self) -> str:
        if self.at >= len(self.tokens):
            return ""
        return next(t for t in self.tokens[self.at] if t is not None)

    def _sum(self) -> Amount:
        sign = -1.0 if self._peek() == "-" else 1.0
        if self._peek() in ("+", "-") and self._peek():
            self.at += 1
        left = self._product().scaled(sign)
        while self._peek() in ("+", "-") and self._peek():
            sign = -1.0 if self._peek() == "-" else 1.0
            self.at += 1
            left = _added(left, self._product().scaled(sign))
        return left

    def _product(self) -> Amount:
        left = self._factor()
        while True:
            token = self._peek()
            if token in ("*", "/") and token:
                self.at += 1
                left = _multiplied(left, self._factor(), token, self.where)
            elif token and (token[0].isalpha() or token == "("):
                left = _multiplied(left, self._factor(), "*", self.where)
            else:
                return left

    def _factor(self) -> Amount:
        if self.at >= len(self.tokens):
            raise self._error()
        number, name, other = self.tokens[self.at]
        self.at += 1
        if number is not None:
            return fixed(float(number))
        if name is not None:
            return variable(name)
        if other == "(" and self.depth < _DEEPEST:
            self.depth += 1
            inner = self._sum()
            self.depth -= 1
            if self._peek() == ")":
                self.at += 1
                return inner
        raise self._error()


def _added(left: Amount, right: Amount) -> Amount:
    return Amount(
        lambda values: left.value(values) + right.value(values), left.variables | right.variables
    )


def _multiplied(left: Amount, right: Amount, sign: str, where: str) -> Amount:
    variables = left.variables | right.variables
    if sign == "*":
        return Amount(lambda values: left.value(values) * right.value(values), variables)

    def divided(values: Values) -> float:
        below = right.value(values)
        if below == 0:
            raise FormulaError(f"{where}: division by zero; change the range of the variable.")
        return left.value(values) / below

    return Amount(divided, variables)
