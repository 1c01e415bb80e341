"""From a session to its report."""

from __future__ import annotations

from phaseid.physics.backscatter import get_rule
from phaseid.physics.elemental import get_model
from phaseid.report.content import Report, Section, Table, build
from phaseid.report.document import document
from phaseid.report.figure import figure, to_bytes
from phaseid.session.sensitivity import sensitivity
from phaseid.session.work import Session


def report_of(session: Session, index: int, top: int) -> Report:
    """Compose the report of one image of a session.

    Parameters
    ----------
    session : Session
    index : int
    top : int
        Candidates per cluster.

    Returns
    -------
    Report

    Raises
    ------
    InputError
        If the image or the evidence cannot be used.
    """
    analysis = next(a for a in session.answers(top=top) if index in a.images)
    image = session.image(index)
    made = document(analysis, index, image, session.notices(index), top)
    picture = to_bytes(figure(image, session.clustering(index), made))
    model, rule = get_model(analysis.conditions.model), get_rule(analysis.conditions.rule)
    sources = [
        f"eta of the elements: {model.source}",
        f"compounds: {rule.source}",
        "mean energy of backscattered electrons: Pouchou & Pichoir 1991",
        "electron range: Kanaya & Okayama 1972",
    ]
    more = [Section(s.title, s.paragraphs) for s in session.knowledge.host.report_sections(made)]
    return build(
        made, picture, sources, [*_decisions(session, index), _assumptions(session, index), *more]
    )


def _assumptions(session: Session, index: int) -> Section:
    """Which assumption carries the answer."""
    changes = sensitivity(session, index)
    rows = tuple(
        (
            c.assumption,
            f"{100 * c.largest:.0f} %",
            str(c.cluster),
            c.before,
            "the same" if c.after == c.before else c.after,
        )
        for c in changes
    )
    heading = ("Changed assumption", "Largest change", "Cluster", "Leader", "Leader then")
    return Section(
        "Which assumption carries the answer",
        (
            "Each line changes one assumption and ranks again; the largest change of any candidate's "
            "probability tells how much rests on it.",
        ),
        Table(heading, rows),
    )


def _decisions(session: Session, index: int) -> list[Section]:
    """What the analyst decided, with the reasons given."""
    words = {"rejected": "rejected", "accepted": "accepted", "known": "given as known"}
    lines = tuple(
        f"Grey {m.grey:.4g}: {m.value} {words[m.kind]}{': ' + m.note if m.note else '.'}"
        for m in session.state.marks
        if m.image == index and m.kind in words
    )
    return [Section("What the analyst decided", lines)] if lines else []
