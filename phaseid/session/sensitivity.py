"""Which assumption carries the answer: the ranking under each model, rule, and without each piece of evidence."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from phaseid.errors import InputError
from phaseid.physics.mixing import defensible_rules
from phaseid.session.answers import Analysis
from phaseid.session.state import State
from phaseid.session.work import Session


@dataclass(frozen=True)
class Change:
    """What one changed assumption does to one image's answer.

    Attributes
    ----------
    assumption : str
        What was changed.
    largest : float
        Largest change of any candidate's probability in any cluster.
    cluster : int
        Id of the cluster it happens in.
    before, after : str
        The leading candidate there.
    """

    assumption: str
    largest: float
    cluster: int
    before: str
    after: str


def sensitivity(session: Session, index: int) -> list[Change]:
    """Change one assumption at a time and rank again.

    Parameters
    ----------
    session : Session
    index : int
        Which image.

    Returns
    -------
    list of Change
        The most telling first.
    """
    base = session.answer_of(index, with_advice=False)
    changes = []
    for told, state in _variants(session, index):
        try:
            other = session.answer_of(index, state=state, with_advice=False)
        except InputError:
            continue
        change = _compared(told, base, other, index)
        if change is not None:
            changes.append(change)
    return sorted(changes, key=lambda c: -c.largest)


def _variants(session: Session, index: int) -> list[tuple[str, State]]:
    state = session.state
    found = [
        (f"eta by {m.name}", replace(state, model=m.name))
        for m in session.knowledge.models()
        if m.name != (state.model or "august-wernisch-1989")
    ]
    found += [
        (f"compounds by {r.name}", replace(state, rule=r.name))
        for r in defensible_rules()
        if r.name != (state.rule or "mass-fraction")
    ]
    found += [
        (
            f"without {m.kind} {m.value} at grey {m.grey:.4g}".replace("  ", " "),
            state.without_mark(m),
        )
        for m in state.marks
        if m.kind in ("known", "standard", "dark", "seen", "unseen", "content") and m.image == index
    ]
    found += [
        (
            f"without context {c}",
            replace(state, contexts=tuple(o for o in state.contexts if o != c)),
        )
        for c in state.contexts
    ]
    return found


def _compared(told: str, base: Analysis, other: Analysis, index: int) -> Change | None:
    if base.ranking is None or other.ranking is None:
        return None
    best: Change | None = None
    for old, new in zip(base.of_image(index), other.of_image(index), strict=True):
        if old.observation is None or new.observation is None or old.known or not old.candidates:
            continue
        before = base.ranking.probability[old.observation]
        after = other.ranking.probability[new.observation]
        size = min(len(before), len(after))
        largest = float(np.abs(before[:size] - after[:size]).max())
        if best is None or largest > best.largest:
            best = Change(told, largest, old.id, old.candidates[0].name, new.candidates[0].name)
    return best
