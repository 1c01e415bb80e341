"""Everything that ships: every file loads, and the checks find nothing that must be mended."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import phaseid_databases
import pytest

from phaseid.phases import database
from phaseid.phases.catalogue import fold
from phaseid.phases.checks import check
from phaseid.phases.table import build
from phaseid.physics.conditions import Conditions

FOLDER = Path(phaseid_databases.__file__).parent
FILES = sorted(FOLDER.glob("*.yaml"))


@pytest.fixture(scope="module")
def databases():
    return [database.load(path) for path in FILES]


def test_files_are_named_as_they_say_and_each_holds_phases(databases):
    assert len(FILES) >= 8
    for path, found in zip(FILES, databases, strict=True):
        assert found.name == path.stem
        assert found.title != found.name
        assert found.phases


def test_every_file_is_registered(knowledge):
    assert {Path(d.path).name for d in knowledge.catalogue.databases} == {p.name for p in FILES}


def test_checks_find_no_fault(knowledge):
    faults = [
        f"{f.location} {f.phase}: {f.message}"
        for f in check(knowledge.catalogue.phases, knowledge.contexts)
        if f.kind == "fault"
    ]
    assert faults == []


def test_no_phase_stands_in_two_files(databases):
    names = [fold(p.name) for d in databases for p in d.phases]
    assert sorted({n for n in names if names.count(n) > 1}) == []


def test_breadth(knowledge):
    assert len(knowledge.catalogue.phases) >= 1500
    known = [p for p in knowledge.catalogue.phases if p.density_range is not None]
    assert len(known) > 0.9 * len(knowledge.catalogue.phases)


def test_every_phase_is_found_by_each_of_its_names(knowledge):
    for phase in knowledge.catalogue.phases:
        for name in phase.names:
            assert knowledge.catalogue.find(name).name == phase.name


def test_every_prediction_is_a_possible_one(knowledge):
    table = build(knowledge.catalogue.phases, Conditions(), cached=False)
    assert np.isfinite(table.row_signal).all()
    assert ((table.eta > 0) & (table.eta < 0.6)).all()
    assert (table.mean_atomic_number_min <= table.mean_atomic_number + 1e-9).all()
    assert (table.mean_atomic_number <= table.mean_atomic_number_max + 1e-9).all()
    np.testing.assert_allclose(np.bincount(table.rows.phase, table.rows.share), 1.0)
