"""How long formulas, databases, the table of all phases and predictions take."""

from __future__ import annotations

import itertools
from pathlib import Path

import numpy as np
import phaseid_databases
import pytest

from phaseid.phases import formula
from phaseid.phases.catalogue import merge
from phaseid.phases.database import load
from phaseid.phases.kept import load_kept
from phaseid.phases.table import build
from phaseid.physics.conditions import Conditions
from phaseid.session.predicting import prediction
from phaseid.session.state import State

FILES = sorted(Path(phaseid_databases.__file__).parent.glob("*.yaml"))
METALS = ("Na", "Mg", "Al", "K", "Ca", "Ti", "Cr", "Mn", "Fe", "Ni", "Cu", "Zn", "Zr", "Ba", "Pb")


def formulas(count):
    """Oxides of two metals in all proportions, each written once."""
    pairs = list(itertools.permutations(METALS, 2))
    amounts = itertools.product(range(1, 9), repeat=2)
    every = (f"{a}{i}{b}{j}O{i + j}" for i, j in amounts for a, b in pairs)
    return list(itertools.islice(every, count))


@pytest.mark.benchmark(group="phases")
def test_parsing_a_thousand_formulas(benchmark):
    texts = formulas(1000)

    def parse_all():
        formula._parsed.cache_clear()
        return [formula.parse(t) for t in texts]

    assert len(benchmark.pedantic(parse_all, rounds=3)) == 1000


@pytest.mark.benchmark(group="phases")
def test_loading_every_database_anew(benchmark):
    def load_all():
        formula._parsed.cache_clear()
        return merge([load(p) for p in FILES])

    assert len(benchmark.pedantic(load_all, rounds=2).phases) >= 1500


@pytest.mark.benchmark(group="phases")
def test_loading_every_database_from_the_cache(benchmark):
    first = merge([load_kept(p) for p in FILES])
    again = benchmark.pedantic(lambda: merge([load_kept(p) for p in FILES]), rounds=5)
    assert again.phases == first.phases


@pytest.mark.benchmark(group="phases")
def test_table_of_all_phases_from_the_cache(benchmark, knowledge):
    phases = knowledge.catalogue.phases
    first = build(phases, Conditions())
    again = benchmark.pedantic(lambda: build(phases, Conditions()), rounds=5)
    np.testing.assert_array_equal(again.row_signal, first.row_signal)


@pytest.mark.benchmark(group="phases")
def test_predicting_ten_thousand_formulas(benchmark, knowledge):
    texts = formulas(10_000)

    def predict_all():
        formula._parsed.cache_clear()
        return prediction(State(), texts, knowledge=knowledge)

    document = benchmark.pedantic(predict_all, rounds=1)
    assert len(document["phases"]) == 10_000
    assert all(0 < p["eta"] < 0.6 for p in document["phases"])
