"""From what the user said about greys to evidence about clusters."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from phaseid.errors import InputError
from phaseid.inference.evidence import content_evidence, elements_evidence, none_likelihood
from phaseid.inference.observations import Anchor, Observation, dark_level
from phaseid.session.candidates import Candidates
from phaseid.session.knowledge import Knowledge
from phaseid.session.state import Mark, State

Floats = NDArray[np.float64]

# A mark must lie within this share of the greys' range of the cluster it means.
NEAR = 0.06


@dataclass(frozen=True)
class Place:
    """A cluster a mark can mean: its image, its grey there, and its row in the ranking."""

    image: int
    grey: float
    grey_sd: float
    observation: int


@dataclass
class Marked:
    """Evidence gathered from the marks.

    Attributes
    ----------
    anchors : list of Anchor
    known : dict of int to int
        Observation to phase index.
    evidence : ndarray of shape (K, R)
    none_evidence : ndarray of shape (K,)
    seen, unseen : dict of int to list of str
    listed, accepted : dict of int to list of int / int
        Phases to show always; phases the user has accepted.
    """

    anchors: list[Anchor]
    known: dict[int, int]
    evidence: Floats
    none_evidence: Floats
    seen: dict[int, list[str]] = field(default_factory=dict)
    unseen: dict[int, list[str]] = field(default_factory=dict)
    listed: dict[int, list[int]] = field(default_factory=dict)
    accepted: dict[int, int] = field(default_factory=dict)


def extra_phases(state: State) -> tuple[str, ...]:
    """Phases that marks speak of; those in no database are taken as formulas."""
    kinds = ("known", "listed", "accepted", "rejected")
    return tuple(dict.fromkeys(m.value for m in state.marks if m.kind in kinds))


def nearest(places: Sequence[Place], mark: Mark) -> Place:
    """Find the cluster a mark means.

    Raises
    ------
    InputError
        If no cluster lies near the mark's grey.
    """
    here = [p for p in places if p.image == mark.image]
    if not here:
        raise InputError("No cluster is left to give evidence about; take an exclusion back.")
    best = min(here, key=lambda p: abs(p.grey - mark.grey))
    span = max(p.grey for p in here) - min(p.grey for p in here)
    if abs(best.grey - mark.grey) > max(NEAR * span, 3 * best.grey_sd, 0.02 * abs(best.grey)):
        greys = ", ".join(f"{p.grey:.4g}" for p in sorted(here, key=lambda p: p.grey))
        raise InputError(
            f"No cluster lies near grey {mark.grey:g}; the clusters are at {greys}: give one of these."
        )
    return best


def gather(
    state: State,
    knowledge: Knowledge,
    candidates: Candidates,
    observations: Sequence[Observation],
    places: Sequence[Place],
    images: Sequence[int],
) -> Marked:
    """Turn the marks of a state into evidence.

    Parameters
    ----------
    state : State
    knowledge : Knowledge
    candidates : Candidates
    observations : sequence of Observation
        Rows of the ranking.
    places : sequence of Place
        Clusters of all images of the analysis.
    images : sequence of int
        Images the analysis covers; marks on others are passed over.

    Returns
    -------
    Marked

    Raises
    ------
    InputError
        For an unknown phase or element, a grey without a cluster, or two phases for one cluster.
    """
    gatherer = _Gatherer(knowledge, candidates, observations, places)
    for mark in state.marks:
        if mark.image in images:
            gatherer.take(mark)
    for k in range(len(observations)):
        gatherer.settle_elements(k)
    return gatherer.marked


def read_content(text: str) -> dict[str, float]:
    """Read ``Fe=60,O=30``: mass per cent by element.

    Raises
    ------
    InputError
        If it is not of that form.
    """
    found: dict[str, float] = {}
    for part in text.split(","):
        symbol, _, amount = part.strip().partition("=")
        try:
            value = float(amount)
        except ValueError:
            value = float("nan")
        if not 0 < value <= 100:
            raise InputError(
                f"{text!r} is no content; write mass per cent by element, for example Fe=60,O=30."
            )
        found[symbol.strip()] = value
    return found


class _Gatherer:
    """Takes the marks one by one."""

    def __init__(
        self,
        knowledge: Knowledge,
        candidates: Candidates,
        observations: Sequence[Observation],
        places: Sequence[Place],
    ) -> None:
        self.knowledge, self.candidates = knowledge, candidates
        self.observations, self.places = observations, places
        rows = len(candidates.set.signal)
        count = len(observations)
        self.marked = Marked([], {}, np.ones((count, rows)), np.ones(count))
        self.handlers: dict[str, Callable[[Mark], None]] = {
            "known": self._known,
            "standard": self._standard,
            "dark": self._dark,
            "seen": self._elements,
            "unseen": self._elements,
            "content": self._content,
            "rejected": self._rejected,
            "accepted": self._listed,
            "listed": self._listed,
        }

    def take(self, mark: Mark) -> None:
        handler = self.handlers.get(mark.kind)
        if handler is not None:
            handler(mark)

    def _known(self, mark: Mark) -> None:
        phase, names = self.candidates.index(mark.value), self.candidates.set.names
        place = nearest(self.places, mark)
        k, known = place.observation, self.marked.known
        if k in known:
            if known[k] == phase:
                return
            raise InputError(
                f"The cluster at grey {place.grey:.4g} is given as both {names[known[k]]} and "
                f"{names[phase]}; take one of the two back."
            )
        known[k] = phase
        seen = self.observations[k]
        self.marked.anchors.append(
            Anchor(
                seen.grey_mean,
                seen.grey_se,
                *self.candidates.rows_of(phase),
                label=names[phase],
                observation=k,
                clipped=seen.clipped,
                image=seen.image,
            )
        )

    def _standard(self, mark: Mark) -> None:
        rows = self.knowledge.standard(mark.value, self.candidates.conditions)
        anchor = Anchor(mark.grey, self._typed_error(), *rows, label=f"standard {mark.value}")
        self.marked.anchors.append(anchor)

    def _dark(self, mark: Mark) -> None:
        self.marked.anchors.append(dark_level(mark.grey, self._typed_error()))

    def _typed_error(self) -> float:
        """Error of a grey typed by hand: the last place a person reads off, thousandths of the range."""
        greys = [o.grey_mean for o in self.observations]
        span = max(greys) - min(greys)
        return max(0.003 * (span or abs(greys[0])), 1e-9)

    def _elements(self, mark: Mark) -> None:
        kept = self.marked.seen if mark.kind == "seen" else self.marked.unseen
        symbols = [s.strip() for s in mark.value.split(",") if s.strip()]
        kept.setdefault(nearest(self.places, mark).observation, []).extend(symbols)

    def _content(self, mark: Mark) -> None:
        k = nearest(self.places, mark).observation
        likelihood = content_evidence(self.candidates.set, read_content(mark.value))
        self.marked.evidence[k] *= likelihood
        self.marked.none_evidence[k] *= none_likelihood(self.candidates.set, likelihood)

    def _rejected(self, mark: Mark) -> None:
        k, phase = nearest(self.places, mark).observation, self.candidates.index(mark.value)
        self.marked.evidence[k, self.candidates.set.phase == phase] = 0.0

    def _listed(self, mark: Mark) -> None:
        k, phase = nearest(self.places, mark).observation, self.candidates.index(mark.value)
        self.marked.listed.setdefault(k, []).append(phase)
        if mark.kind == "accepted":
            self.marked.accepted[k] = phase

    def settle_elements(self, k: int) -> None:
        marked, candidates = self.marked, self.candidates
        seen, unseen = marked.seen.get(k, []), marked.unseen.get(k, [])
        both = sorted(set(seen) & set(unseen))
        if both:
            raise InputError(
                f"{both[0]} is given as both seen and not seen in one cluster; take one of the two "
                "back."
            )
        if seen or unseen:
            likelihood = elements_evidence(candidates.visible, seen, unseen)
            marked.evidence[k] *= likelihood
            marked.none_evidence[k] *= none_likelihood(candidates.set, likelihood)
