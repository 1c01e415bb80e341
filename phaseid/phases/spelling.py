"""Spellings of formulas brought to one: unicode, HTML, LaTeX, carets, fractions, decimal commas.

Every character that is left knows where it came from, so that an error names the place in what was typed.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass

DOTS = "·•∙⋅*・‧×:"
VACANCIES = "□◻☐▢"

_CHARACTERS: dict[str, str] = dict(zip("₀₁₂₃₄₅₆₇₈₉₊₋．", "0123456789+-.", strict=True))
_CHARACTERS |= dict.fromkeys("–—−‐‑", "-") | {"ₓ": "x", "ᵧ": "y", "ₙ": "n", "δ": "w", "∑": "Σ"}
_CHARACTERS |= {"½": ".5", "¼": ".25", "¾": ".75", "⅓": ".3333", "⅔": ".6667"}
_CHARACTERS |= {"（": "(", "）": ")", "，": ",", "Ｏ": "O", "〈": "<", "&lt;": "<", "≤": "<"}
# Superscripts hold charges, which say nothing about the composition.
_CHARACTERS |= dict.fromkeys("⁰¹²³⁴⁵⁶⁷⁸⁹⁺⁻$\u200b\u2060\ufeff", "")

_NUMBER = r"(?:\d+(?:\.\d+)?|\.\d+)"
_Replacement = str | Callable[[re.Match[str]], str]
# In this order.
_RULES: tuple[tuple[str, _Replacement], ...] = (
    (r"&#(\d+);", lambda m: chr(int(m[1])) if int(m[1]) < 0x110000 else ""),
    (r"&(?:middot|sdot|bull);|\\(?:cdot|bullet|times)", "·"),
    (r"\\(?:square|Box)|&square;", "□"),
    (r"<sup>[^<]*</sup>|</?su[bp]>|\\mathrm|\\text|\\,", ""),
    (r"_\{([^{}]*)\}", lambda m: "{" + m[1] + "}"),
    # A caret opens a charge; a second one closes it.
    (r"\^\{?\d*[+-]+\}?\^?", ""),
    (r"\^\{?[+-]?\d+\}?\^?", ""),
    (r"_", ""),
    # CaSO4 x 2H2O
    (rf"(?<=[\w)\]])\s+[xX]\s*(?={_NUMBER}?\s*H2O)", "·"),
    # About so much is so much; less than so much is a range from nothing.
    (r"[~≈∼≃](?=[\d.a-z])", ""),
    (rf"<=?\s*({_NUMBER})", lambda m: "{0-" + m[1] + "}"),
    (r"\(\?\)|\?", ""),
    # Oxidation numbers in Roman numerals; (I) and (V) alone could be iodine and vanadium.
    (r"(?<=[A-Za-z])\((?:II|III|IV|VI|VII|VIII)\)", ""),
    # A comma between digits cannot begin an occupant.
    (r"(?<=[A-Za-z)\]]\d),(?=\d)", "."),
    (r"\s+", ""),
)
_SYMBOLS_INSIDE = re.compile(r"[A-Z][a-z]|[A-Z]\d|[A-Z]{2}|[A-Z]\s*[,(\[]")
# Most formulas need none of this.
_PLAIN = re.compile(r"[A-Za-z0-9(){}\[\]·+*/,-]*")
_ODDITIES = re.compile(r"\([IV]|\d,\d")


@dataclass(frozen=True)
class Spelled:
    """Text in one spelling, and the position in the original of each of its characters."""

    text: str
    positions: tuple[int, ...]


def respelled(text: str) -> Spelled:
    """Bring a formula to one spelling.

    Parameters
    ----------
    text : str

    Returns
    -------
    Spelled
    """
    if _PLAIN.fullmatch(text) and not _ODDITIES.search(text):
        return Spelled(_brackets(text), tuple(range(len(text) + 1)))
    plain, positions = "", []
    for at, character in enumerate(text):
        found = _CHARACTERS.get(character, character)
        plain += found
        positions += [at] * len(found)
    for pattern, replacement in _RULES:
        plain, positions = _replaced(pattern, replacement, plain, positions)
    plain = _brackets(plain)
    plain, positions = _dotted(plain, positions)
    return Spelled(plain, (*positions, len(text)))


def _replaced(
    pattern: str, replacement: _Replacement, text: str, positions: list[int]
) -> tuple[str, list[int]]:
    made, kept, done = "", [], 0
    for found in re.finditer(pattern, text):
        new = replacement if isinstance(replacement, str) else replacement(found)
        made += text[done : found.start()] + new
        kept += positions[done : found.start()] + [positions[found.start()]] * len(new)
        done = found.end()
    return made + text[done:], kept + positions[done:]


def _brackets(text: str) -> str:
    """Braces around symbols are brackets, braces around arithmetic stay."""
    if "{" not in text:
        return text
    characters, open_at = list(text), []
    for at, character in enumerate(text):
        if character == "{":
            open_at.append(at)
        elif character == "}" and open_at:
            first = open_at.pop()
            if _SYMBOLS_INSIDE.search(text[first + 1 : at]):
                characters[first], characters[at] = "[", "]"
    return "".join(characters)


def _dotted(text: str, positions: list[int]) -> tuple[str, list[int]]:
    """Tell a full stop that joins parts from a decimal point: before water, and between multiplied oxides.

    Who writes a raised dot anywhere means every full stop as a decimal point.
    """
    if any(dot in text for dot in DOTS):
        return text, positions
    text = re.sub(r"\.((?:\d+\.)?\d*H2O)", r"·\1", text)
    text = re.sub(r"(?<=O)\.(?=\d+[A-Z])", "·", text)
    if re.match(r"\d+(?:\.\d+)?[A-Z]", text):
        text = re.sub(r"(?<=[A-Za-z\d)])\.(?=\d*[A-Z(])", "·", text)
    return text, positions
