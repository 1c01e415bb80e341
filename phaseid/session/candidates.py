"""The candidates at given conditions, with what is shown about them."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from phaseid.errors import InputError
from phaseid.hooks.specs import ClusterSummary, Situation
from phaseid.inference.candidates import CandidateSet
from phaseid.inference.departure import Departure
from phaseid.phases.catalogue import fold
from phaseid.phases.records import Phase
from phaseid.physics.conditions import Conditions
from phaseid.physics.signals import signal_under
from phaseid.session.answers import Candidate

Floats = NDArray[np.float64]

# Holes, cracks and pores are candidates of every dark cluster. How much signal comes out of one depends
# on its depth; common practice: near nothing up to a third of quartz.
VOID = "Pore, crack or hole"
VOID_SIGNALS = (0.002, 0.008, 0.016, 0.028)
VOID_SHARES = (0.4, 0.3, 0.2, 0.1)
VOID_SD = 0.005
# Density of defects, orientation, trace elements: what differs between two grains of one phase, as a
# share of the signal. Common practice.
GRAIN_SD = 0.01


@dataclass(frozen=True)
class Shown:
    """What tables say about one phase."""

    name: str
    formula: str
    database: str
    mean_atomic_number: float
    eta: float
    hazard: str | None
    note: str | None
    structure: str
    range_um: float


@dataclass(frozen=True)
class Candidates:
    """All phases at given conditions.

    Attributes
    ----------
    conditions : Conditions
    phases : tuple of Phase
        The P - 1 phases of the databases and the user; the hole comes last and is none of them.
    set : CandidateSet
        P phases in R rows.
    departure : Departure
        The smooth part of the model's error.
    visible : ndarray of shape (R, 103)
        Probability that each element is reported in a spectrum.
    variable : ndarray of bool, shape (P,)
        Phases with a range of compositions.
    shown : tuple of Shown
    lookup : mapping of str to int
        Names, other names and formulas, folded, to phase index.
    extra : tuple of str
        Phases the user gave as formulas.
    elsewhere : dict
        Signals at other beam energies, once asked for.
    """

    conditions: Conditions
    phases: tuple[Phase, ...]
    set: CandidateSet
    departure: Departure
    visible: Floats
    variable: NDArray[np.bool_]
    shown: tuple[Shown, ...]
    lookup: Mapping[str, int]
    extra: tuple[str, ...] = ()
    elsewhere: dict[float, Floats] = field(default_factory=dict, compare=False, repr=False)

    def situation(
        self, contexts: Sequence[str], clusters: Sequence[ClusterSummary] = ()
    ) -> Situation:
        """What plugins may look at; the hole is not among the phases."""
        return Situation(
            self.conditions,
            tuple(contexts),
            self.phases,
            np.array([s.mean_atomic_number for s in self.shown[:-1]]),
            np.array([s.eta for s in self.shown[:-1]]),
            self.set.mean_signal[:-1],
            tuple(clusters),
        )

    def signals_at(self, energy_keV: float) -> Floats:
        """Mean predicted signal of each phase at another beam energy, all else the same."""
        if energy_keV not in self.elsewhere:
            conditions = replace(self.conditions, energy_keV=energy_keV)
            rows = signal_under(self.set.mass_fractions.astype(float), conditions)
            rows[-len(VOID_SIGNALS) :] = VOID_SIGNALS
            self.elsewhere[energy_keV] = self.set.by_phase(self.set.share * rows)
        return self.elsewhere[energy_keV]

    def index(self, text: str) -> int:
        """Index of a phase by name, other name or formula.

        Raises
        ------
        InputError
            If there is none, with the nearest names.
        """
        found = self.lookup.get(fold(text))
        if found is not None:
            return found
        import difflib

        names = [s.name for s in self.shown]
        by_fold = {fold(n): n for n in names}
        near = difflib.get_close_matches(fold(text), by_fold, n=3, cutoff=0.6)
        hint = f" Did you mean {', '.join(by_fold[n] for n in near)}?" if near else ""
        raise InputError(
            f"No phase is called {text!r}; see 'phaseid database list', or give a formula.{hint}"
        )

    def rows_of(self, phase: int) -> tuple[Floats, Floats, Floats]:
        """Signals, own errors and shares of a phase's composition variants."""
        rows = np.flatnonzero(self.set.phase == phase)
        return self.set.signal[rows], self.set.own_sd[rows], self.set.share[rows]

    def describe(
        self,
        phase: int,
        predicted_grey: float,
        predicted_grey_sd: float,
        probability: float,
        group: int,
        listed: bool,
    ) -> Candidate:
        """A candidate as it is shown."""
        shown = self.shown[phase]
        return Candidate(
            phase,
            shown.name,
            shown.formula,
            shown.database,
            shown.mean_atomic_number,
            shown.eta,
            float(self.set.mean_signal[phase]),
            predicted_grey,
            predicted_grey_sd,
            probability,
            group,
            shown.hazard,
            shown.note,
            listed,
        )


def void_shown() -> Shown:
    """What tables say about a hole."""
    return Shown(
        VOID,
        "no material",
        "built in",
        0.0,
        0.0,
        None,
        "Grey depends on its depth.",
        "no structure",
        np.nan,
    )
