"""Databases merged into one catalogue that finds phases by name, other name or formula."""

from __future__ import annotations

import difflib
from collections.abc import Sequence
from dataclasses import dataclass, field

from phaseid.errors import InputError
from phaseid.phases.database import Database
from phaseid.phases.records import Phase


def fold(text: str) -> str:
    """Spelling in which names and formulas are compared."""
    return "".join(text.split()).casefold()


@dataclass(frozen=True)
class Catalogue:
    """All phases of several databases.

    Attributes
    ----------
    databases : tuple of Database
    phases : tuple of Phase
        In the order of the databases; a later database replaces a phase of the same name, so that a
        laboratory can correct an entry that ships.
    replaced : tuple of Phase
        Entries that were replaced.
    """

    databases: tuple[Database, ...]
    phases: tuple[Phase, ...]
    replaced: tuple[Phase, ...]
    _lookup: dict[str, int] = field(repr=False, compare=False, default_factory=dict)

    def index(self, text: str) -> int | None:
        """Position of a phase by name, other name or formula; None if there is none."""
        return self._lookup.get(fold(text))

    def find(self, text: str) -> Phase:
        """A phase by name, other name or formula.

        Raises
        ------
        InputError
            If there is none; the nearest names are given.
        """
        position = self.index(text)
        if position is not None:
            return self.phases[position]
        near = self.near(text)
        hint = f" Did you mean {', '.join(near)}?" if near else ""
        raise InputError(f"No phase is called {text!r}; see 'phaseid database list'.{hint}")

    def near(self, text: str, most: int = 3) -> list[str]:
        """Names that look like a text."""
        names = {fold(n): p.name for p in self.phases for n in p.names}
        found = difflib.get_close_matches(fold(text), names, n=most, cutoff=0.6)
        return list(dict.fromkeys(names[f] for f in found))


def merge(databases: Sequence[Database]) -> Catalogue:
    """Merge databases.

    Parameters
    ----------
    databases : sequence of Database
        Later ones take precedence.

    Returns
    -------
    Catalogue
    """
    by_name: dict[str, Phase] = {}
    replaced = []
    for database in databases:
        for phase in database.phases:
            key = fold(phase.name)
            if key in by_name:
                replaced.append(by_name[key])
            by_name[key] = phase
    phases = tuple(by_name.values())
    lookup: dict[str, int] = {}
    # Names come before other names, and both before formulas, which several phases share.
    for keys in (
        [(fold(p.name),) for p in phases],
        [tuple(fold(n) for n in p.other_names) for p in phases],
        [(fold(p.formula),) for p in phases],
    ):
        for position, names in enumerate(keys):
            for name in names:
                lookup.setdefault(name, position)
    return Catalogue(tuple(databases), phases, tuple(replaced), lookup)
