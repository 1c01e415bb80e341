"""Contexts: what the sample is, as a tree, and what that says about each phase."""

from __future__ import annotations

import difflib
import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from phaseid.errors import InputError
from phaseid.phases.records import ABUNDANCE, UNLISTED, Phase

Floats = NDArray[np.float64]

# Mounting, polishing and coating materials can turn up on any sample.
EVERYWHERE = "preparation"
# Each of the many is unlikely by itself.
EVERYWHERE_WEIGHT = 0.01
# A phase that is listed only for a special case of the context: most samples are another case.
BELOW = 0.3

_PATH = re.compile(r"[a-z0-9]+(-[a-z0-9]+)*(/[a-z0-9]+(-[a-z0-9]+)*)*")


@dataclass(frozen=True)
class Context:
    """A kind of sample.

    Attributes
    ----------
    path : str
        Place in the tree, general to special: ``steel/aluminium-killed``.
    title : str
    description : str
        One sentence an expert would accept.
    weights : mapping of str to float
        Weights of phases by name that stand above what the databases say.

    Raises
    ------
    ValueError
        For a path that nobody could ask for, or a weight that is no finite number of zero or more.
    """

    path: str
    title: str
    description: str = ""
    weights: Mapping[str, float] = field(default_factory=dict)

    def __post_init__(self) -> None:
        if not _PATH.fullmatch(self.path):
            raise ValueError(
                f"the context path {self.path!r} must be of lower-case words joined by '-', parts by '/'"
            )
        for name, weight in self.weights.items():
            if not 0 <= weight < float("inf"):
                raise ValueError(
                    f"the weight {weight} of {name!r} in {self.path} must be finite and zero or more"
                )


@dataclass(frozen=True)
class Coexistence:
    """Two phases that do not, or rarely, occur together at equilibrium.

    Attributes
    ----------
    first, second : tuple of str
        Names of phases; the rule holds for every pair.
    factor : float
        On the probability of seeing both in one image: 0.05 for "almost never".
    reason : str
        Why, with its source.
    where : tuple of str
        Contexts, with all below them, in which phases have had the time and heat to react. A rule holds
        where every chosen context lies in these; soil, dust and unfired mixtures hold anything beside
        anything. Empty for everywhere.

    Raises
    ------
    ValueError
        For a name that is not in a tuple, or a factor that is not between 0 and 1.
    """

    first: tuple[str, ...]
    second: tuple[str, ...]
    factor: float
    reason: str
    where: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        for given in (self.first, self.second, self.where):
            if isinstance(given, str):
                raise ValueError(f"the name {given!r} must stand in a tuple: ({given!r},)")
        if not 0 <= self.factor <= 1:
            raise ValueError(f"the factor {self.factor} of a coexistence rule must be from 0 to 1")

    def holds(self, contexts: Sequence[str]) -> bool:
        """Whether the rule holds for a sample of the given contexts (full paths)."""
        if not self.where:
            return True
        return bool(contexts) and all(set(self.where) & set(_line(c)) for c in contexts)


class ContextTree:
    """All contexts.

    Parameters
    ----------
    contexts : iterable of Context
        Paths above a given one are added where nobody defines them.
    """

    def __init__(self, contexts: Iterable[Context]) -> None:
        by_path: dict[str, Context] = {}
        for context in sorted(contexts, key=lambda c: c.path):
            by_path.setdefault(context.path, context)
        for path in list(by_path):
            parts = path.split("/")
            for n in range(1, len(parts)):
                above = "/".join(parts[:n])
                by_path.setdefault(above, Context(above, parts[n - 1].replace("-", " ")))
        self._by_path = dict(sorted(by_path.items()))

    def all(self) -> tuple[Context, ...]:
        """All contexts, each after the one above it."""
        return tuple(self._by_path.values())

    @property
    def paths(self) -> tuple[str, ...]:
        """All paths."""
        return tuple(self._by_path)

    def resolve(self, name: str) -> Context:
        """A context by its path or by its last part, where that is unique.

        Raises
        ------
        InputError
            If there is none or several; near matches are given.
        """
        wanted = name.strip().strip("/").casefold().replace(" ", "-")
        if wanted in self._by_path:
            return self._by_path[wanted]
        ends = [p for p in self._by_path if p.endswith("/" + wanted)]
        if len(ends) == 1:
            return self._by_path[ends[0]]
        if ends:
            raise InputError(
                f"The context {name!r} can be {' or '.join(ends)}; give one of these in full."
            )
        last = {p.rsplit("/", 1)[-1]: p for p in self._by_path}
        near = difflib.get_close_matches(wanted, [*self._by_path, *last], n=3, cutoff=0.5)
        meant = dict.fromkeys(last.get(n, n) for n in near)
        hint = f" Did you mean {', '.join(meant)}?" if meant else ""
        raise InputError(f"No context is called {name!r}; see 'phaseid plugins contexts'.{hint}")

    def weights(self, contexts: Sequence[str], phases: Sequence[Phase]) -> Floats:
        """Weight of each phase in the given contexts together.

        Parameters
        ----------
        contexts : sequence of str
            A phase takes its largest weight over them; none gives every phase the same. A phase listed
            for a context counts for every context below it, unless the lower one says otherwise, and
            for every context above it at `BELOW` of its weight.
        phases : sequence of Phase

        Returns
        -------
        ndarray of shape (P,)

        Raises
        ------
        InputError
            For an unknown context.
        """
        if not contexts:
            return np.ones(len(phases))
        weights = np.full(len(phases), UNLISTED)
        for path in [self.resolve(c).path for c in contexts]:
            above = _line(path)
            given: dict[str, float] = {}
            for step in above:
                context = self._by_path.get(step)
                if context is not None:
                    given.update({n.casefold(): w for n, w in context.weights.items()})
            for i, phase in enumerate(phases):
                weight = given.get(phase.name.casefold(), _weight(phase, above))
                weights[i] = max(weights[i], weight)
        return weights


def _line(path: str) -> list[str]:
    """A path and all above it, general first."""
    parts = path.split("/")
    return ["/".join(parts[: n + 1]) for n in range(len(parts))]


def _weight(phase: Phase, above: Sequence[str]) -> float:
    """The most special statement about a phase counts; preparation materials are always possible."""
    for step in reversed(above):
        if step in phase.contexts:
            return ABUNDANCE[phase.contexts[step]]
    below = [ABUNDANCE[w] for p, w in phase.contexts.items() if p.startswith(above[-1] + "/")]
    weight = BELOW * max(below) if below else UNLISTED
    if any(p.split("/")[0] == EVERYWHERE for p in phase.contexts):
        weight = max(weight, EVERYWHERE_WEIGHT)
    return weight
