"""The report in its three formats, and the sensitivity it shows."""

from __future__ import annotations

import io

import pytest

from phaseid.report.formats import FORMATS
from phaseid.report.making import report_of
from phaseid.session.sensitivity import sensitivity

from .conftest import scene_greys


@pytest.fixture
def told(session):
    greys = scene_greys()
    session.apply("a", session.with_mark("known", float(greys[2]), "Magnetite"))
    session.apply("b", session.with_mark("dark", 20.0))
    session.apply("c", session.with_mark("rejected", float(greys[1]), "Dolomite", "no <rhombs>"))
    return session


def test_sensitivity_names_every_assumption(told):
    changes = sensitivity(told, 0)
    names = " ".join(c.assumption for c in changes)
    for word in (
        "reuter-1972",
        "z-fraction",
        "without known Magnetite",
        "without dark",
        "without context",
    ):
        assert word in names
    assert all(0 <= c.largest <= 1 for c in changes)
    assert changes == sorted(changes, key=lambda c: -c.largest)
    # The scale rests on these two; without one of them the list must change.
    assert next(c.largest for c in changes if "without dark" in c.assumption) > 0.02


@pytest.mark.parametrize("ending", sorted(FORMATS))
def test_report_says_what_it_must(told, ending):
    report = report_of(told, 0, top=5)
    written = FORMATS[ending](report)
    if ending == ".docx":
        import docx

        document = docx.Document(io.BytesIO(written))
        text = "\n".join(p.text for p in document.paragraphs)
        text += "\n".join(c.text for t in document.tables for r in t.rows for c in r.cells)
        assert len(document.inline_shapes) == 1
    else:
        text = written.decode("utf-8")
    for word in ("Magnetite", "Quartz", "none of these", "licensed practice", "What to measure next",
                 "Which assumption carries the answer", "August", "Respirable"):  # fmt: skip
        assert word in text
    if ending == ".html":
        assert "no &lt;rhombs&gt;" in text  # what the user typed is text, not markup
        assert "data:image/png;base64," in text
