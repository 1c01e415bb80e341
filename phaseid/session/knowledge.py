"""What the tool knows before it sees an image: databases, contexts, rules, plugins."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from phaseid.errors import InputError
from phaseid.hooks.host import PluginHost, make_host
from phaseid.hooks.specs import ClusterSummary
from phaseid.inference.candidates import CandidateSet
from phaseid.inference.departure import smooth_departure
from phaseid.inference.evidence import visibility
from phaseid.phases.catalogue import Catalogue, fold, merge
from phaseid.phases.contexts import Coexistence, ContextTree
from phaseid.phases.formula import FormulaError, parse
from phaseid.phases.kept import load_kept
from phaseid.phases.records import ABUNDANCE, Phase
from phaseid.phases.table import PhaseTable, build
from phaseid.physics.conditions import Conditions
from phaseid.physics.elemental import BackscatterModel, models
from phaseid.session.answers import Notice
from phaseid.session.candidates import (
    GRAIN_SD,
    VOID,
    VOID_SD,
    VOID_SHARES,
    VOID_SIGNALS,
    Candidates,
    Shown,
    void_shown,
)
from phaseid.session.learned import Learned, learned_weights
from phaseid.session.state import State

Floats = NDArray[np.float64]

GIVEN = "given by the user"


class Knowledge:
    """Databases, contexts and plugins.

    Parameters
    ----------
    host : PluginHost
    catalogue : Catalogue
    learned : Learned or None
        This laboratory's accepted identifications; None for none.
    """

    def __init__(
        self, host: PluginHost, catalogue: Catalogue, learned: Learned | None = None
    ) -> None:
        self.host, self.catalogue, self.learned = host, catalogue, learned
        self.contexts = ContextTree(host.contexts())
        self._candidates = lru_cache(maxsize=16)(self._make_candidates)

    @classmethod
    def load(
        cls,
        databases: Sequence[str] = (),
        host: PluginHost | None = None,
        learned: Learned | None = None,
    ) -> Knowledge:
        """Load what ships, what plugins add, and the given database files.

        A database that a plugin adds and that is faulty is named among the notices and left out.

        Raises
        ------
        InputError
            If a given database file is faulty.
        """
        host = host or make_host()
        read = []
        for plugin, path in host.databases_by_plugin():
            try:
                read.append(load_kept(path))
            except InputError as error:
                host.report(plugin, "register_databases", str(error))
        read += [load_kept(p) for p in databases]
        return cls(host, merge(read), learned if learned is not None else Learned())

    def model(self, name: str) -> BackscatterModel | str:
        """A backscatter model by name, those of plugins included."""
        added = {m.name: m for m in self.host.backscatter_models()}
        return added.get(name, name)

    def models(self) -> tuple[BackscatterModel, ...]:
        """All models that can be chosen."""
        return (*models(), *self.host.backscatter_models())

    def notices(self) -> list[Notice]:
        """Plugins that failed."""
        return [
            Notice(
                "plugin-failed",
                f"The plugin {p.plugin} failed ({p.moment}: {p.message}) and is skipped.",
                "Mend or remove it; see 'phaseid plugins list'.",
            )
            for p in self.host.problems
        ]

    def check_contexts(self, contexts: Sequence[str]) -> tuple[str, ...]:
        """Full paths of contexts.

        Raises
        ------
        InputError
            For an unknown or ambiguous one.
        """
        return tuple(self.contexts.resolve(c).path for c in contexts)

    def candidates(self, conditions: Conditions, extra: Sequence[str] = ()) -> Candidates:
        """All candidates at given conditions.

        Parameters
        ----------
        conditions : Conditions
        extra : sequence of str
            Phases the user speaks of; those that no database has are read as formulas.

        Returns
        -------
        Candidates
        """
        formulas = tuple(
            text
            for text in extra
            if self.catalogue.index(text) is None and fold(text) != fold(VOID) and _is_formula(text)
        )
        return self._candidates(conditions, formulas)

    def standard(self, text: str, conditions: Conditions) -> tuple[Floats, Floats, Floats]:
        """Signals, own errors and shares of a standard given by name or formula.

        Raises
        ------
        InputError
            If it is neither a phase nor a formula.
        """
        position = self.catalogue.index(text)
        phase = (
            self.catalogue.phases[position]
            if position is not None
            else given_phase(text, self.catalogue)
        )
        table = build([phase], conditions, cached=False)
        # A standard is chosen for being homogeneous: its grains do not differ.
        return table.row_signal, table.row_own_sd, np.asarray(table.rows.share)

    def prior(self, state: State, candidates: Candidates) -> Floats:
        """Weight of every candidate from contexts, plugins and this laboratory's own counts."""
        contexts = self.check_contexts(state.contexts)
        phases = candidates.phases
        weights = np.append(self.contexts.weights(contexts, phases), ABUNDANCE["common"])
        if not contexts:
            weights[-1] = 1.0
        if state.site_knowledge and self.learned is not None:
            index = {name: i for i, name in enumerate(candidates.set.names)}
            counts = self.learned.counts(contexts)
            weights = learned_weights(weights, index, counts)
        situation = candidates.situation(contexts)
        weights[:-1] *= self.host.factors(situation)
        if contexts:
            weights[:-1] *= self.host.possible(situation)
        if not weights.sum() > 0:
            raise InputError("The plugins exclude every phase; see 'phaseid plugins list'.")
        return weights

    def search(self, text: str, most: int = 60) -> list[tuple[str, str]]:
        """Phases whose name, other name or formula holds a text: name, and name with formula."""
        wanted = fold(text)
        found = []
        for phase in self.catalogue.phases:
            names = [fold(n) for n in (*phase.names, phase.formula)]
            if any(wanted in n for n in names):
                starts = not any(n.startswith(wanted) for n in names)
                found.append((starts, phase.name, f"{phase.name}  {phase.formula}"))
        # What begins with the text comes first.
        return [(name, shown) for _, name, shown in sorted(found)[:most]]

    def image_factors(
        self,
        contexts: Sequence[str],
        candidates: Candidates,
        clusters: Sequence[ClusterSummary],
        image: Mapping[str, Any],
    ) -> Floats:
        """Factors of plugins' extra evidence about an image, shape (clusters, P)."""
        situation = candidates.situation(self.check_contexts(contexts), clusters)
        factors = np.ones((len(clusters), candidates.set.size))
        for name, factor in self.host.evidence(situation, image).items():
            position = candidates.lookup.get(fold(name))
            if position is not None:
                factors[:, position] *= factor
        return factors

    def coexistence(
        self, candidates: Candidates, contexts: Sequence[str] = ()
    ) -> dict[tuple[int, int], float]:
        """Coexistence rules that hold in contexts, as factors on pairs of phase indices."""
        full = self.check_contexts(contexts)
        return _pairs([r for r in self.host.coexistence() if r.holds(full)], candidates)

    def _make_candidates(self, conditions: Conditions, formulas: tuple[str, ...]) -> Candidates:
        given = [given_phase(text, self.catalogue) for text in formulas]
        table = build([*self.catalogue.phases, *given], conditions)
        return _candidates(table)


def _is_formula(text: str) -> bool:
    try:
        parse(text)
    except FormulaError:
        return False
    return True


def given_phase(text: str, catalogue: Catalogue) -> Phase:
    """A phase that the user has given as a formula."""
    try:
        parse(text)
    except FormulaError as error:
        near = catalogue.near(text)
        hint = f" Did you mean {', '.join(near)}?" if near else ""
        raise InputError(
            f"No phase is called {text!r}, and it is no formula either ({str(error).rstrip('.')}); see "
            f"'phaseid database list'.{hint}"
        ) from None
    return Phase(text, text, GIVEN, database=GIVEN)


def _candidates(table: PhaseTable) -> Candidates:
    """Add the hole to the phases of a table and set up what the inference needs."""
    count = len(table.phases)
    own = np.hypot(table.row_own_sd, GRAIN_SD * table.row_signal)
    holes = len(VOID_SIGNALS)
    rows = CandidateSet(
        (*(p.name for p in table.phases), VOID),
        np.concatenate([table.rows.phase, np.full(holes, count)]).astype(np.intp),
        np.concatenate([table.row_signal, VOID_SIGNALS]),
        np.concatenate([own, np.full(holes, VOID_SD)]),
        np.concatenate([table.rows.share, VOID_SHARES]),
        np.concatenate(
            [table.rows.mass_fractions, np.zeros((holes, table.rows.mass_fractions.shape[1]))]
        ).astype(np.float32),
    )
    departure = smooth_departure(
        rows.axis.upper, lambda signal: table.relative_sd * signal, table.length
    )
    lookup: dict[str, int] = {
        fold(VOID): count,
        "pore": count,
        "void": count,
        "hole": count,
        "crack": count,
    }
    for keys in (
        [(p.formula,) for p in table.phases],
        [p.other_names for p in table.phases],
        [(p.name,) for p in table.phases],
    ):
        # Later rounds win: a name is more than an other name, and both are more than a formula.
        for i in range(count - 1, -1, -1):
            lookup.update({fold(text): i for text in keys[i]})
    shown = [
        Shown(
            p.name,
            p.formula,
            p.database,
            float(table.mean_atomic_number[i]),
            float(table.eta[i]),
            p.hazard,
            p.note,
            f"{p.crystal_system}, {p.formula}",
            float(table.range_um[i]),
        )
        for i, p in enumerate(table.phases)
    ]
    return Candidates(
        table.conditions,
        table.phases,
        rows,
        departure,
        visibility(rows, table.conditions.energy_keV),
        np.append(table.variable, True),
        (*shown, void_shown()),
        lookup,
        tuple(p.name for p in table.phases if p.database == GIVEN),
    )


def _pairs(rules: Sequence[Coexistence], candidates: Candidates) -> dict[tuple[int, int], float]:
    pairs: dict[tuple[int, int], float] = {}
    for rule in rules:
        first = [candidates.lookup[fold(n)] for n in rule.first if fold(n) in candidates.lookup]
        second = [candidates.lookup[fold(n)] for n in rule.second if fold(n) in candidates.lookup]
        for p in first:
            for q in second:
                if p != q:
                    key = (min(p, q), max(p, q))
                    pairs[key] = min(pairs.get(key, 1.0), rule.factor)
    return pairs
