"""Plugins: every hook is called, a broken plugin is named and skipped, order does not matter."""

from __future__ import annotations

import importlib
import inspect
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest

from phaseid.hooks import hookimpl, specs
from phaseid.hooks.host import BUILT_IN, make_host
from phaseid.hooks.specs import ReportSection, Situation
from phaseid.phases.contexts import Coexistence, Context
from phaseid.phases.records import Phase
from phaseid.physics.conditions import Conditions
from phaseid.physics.elemental import BackscatterModel, elemental_eta

ROOT = Path(__file__).resolve().parents[2]
PHASES = (Phase("A", "FeO", "from memory"), Phase("B", "MgO", "from memory"))
SITUATION = Situation(
    Conditions(),
    ("steel",),
    PHASES,
    np.array([20.0, 10]),
    np.array([0.2, 0.1]),
    np.array([0.1, 0.05]),
)
HOOKS = [n for n, f in vars(specs).items() if inspect.isfunction(f) and hasattr(f, "phaseid_spec")]


def plugin(**functions):
    """A plugin object with the given hook implementations."""
    return SimpleNamespace(**{name: hookimpl(f) for name, f in functions.items()})


def host(*plugins):
    made = make_host(built_in=(), entry_points=False, folders=[])
    for n, one in enumerate(plugins):
        made.add(one, f"plugin {n}", "a test")
    return made


def test_register_databases():
    assert host(plugin(register_databases=lambda: ["a.yaml"])).databases() == [Path("a.yaml")]


def test_register_contexts():
    context = Context("moon", "Moon")
    assert host(plugin(register_contexts=lambda: [context])).contexts() == [context]


def test_register_backscatter_models():
    flat = BackscatterModel("flat", lambda z, e: 0 * z + 0.3, None, (1.0, 103.0), "a test", "")
    found = host(plugin(register_backscatter_models=lambda: [flat])).backscatter_models()
    assert float(elemental_eta(np.array([26.0]), 20.0, found[0])[0]) == pytest.approx(0.3)


def test_register_coexistence():
    rule = Coexistence(("A",), ("B",), 0.1, "they react; common practice")
    assert host(plugin(register_coexistence=lambda: [rule])).coexistence() == [rule]


def test_filter_candidates():
    keep_first = plugin(filter_candidates=lambda situation: situation.mean_atomic_number > 15)
    assert host(keep_first).possible(SITUATION).tolist() == [True, False]
    assert host(keep_first, plugin(filter_candidates=lambda: None)).possible(SITUATION)[0]


def test_weigh_candidates_multiply_whatever_the_order():
    first = plugin(weigh_candidates=lambda situation: np.array([2.0, 1.0]))
    second = plugin(weigh_candidates=lambda situation: np.array([3.0, 0.5]))
    assert host(first, second).factors(SITUATION).tolist() == [6.0, 0.5]
    assert host(second, first).factors(SITUATION).tolist() == [6.0, 0.5]


def test_gather_evidence():
    one = plugin(gather_evidence=lambda situation, image: {"A": 2.0} if image["path"] else {})
    two = plugin(gather_evidence=lambda image: {"A": 2.0})
    assert host(one, two).evidence(SITUATION, {"path": "x"}) == {"A": 4.0}


def test_report_sections():
    section = ReportSection("More", ("text",))
    assert host(plugin(report_sections=lambda document: [section])).report_sections({}) == [section]


@pytest.mark.parametrize("hook", HOOKS)
def test_every_hook_has_a_test_and_a_heading_with_its_arguments(hook):
    here = Path(__file__).read_text(encoding="utf-8")
    assert f"{hook}=" in here
    arguments = ", ".join(inspect.signature(getattr(specs, hook)).parameters)
    assert f"### `{hook}({arguments})`" in (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")


def test_eight_hooks_are_specified():
    assert len(HOOKS) == 8


@pytest.mark.parametrize(
    ("broken", "call"),
    [
        ({"register_contexts": lambda: 1 / 0}, lambda h: h.contexts()),
        ({"register_contexts": lambda: ["not a context"]}, lambda h: h.contexts()),
        ({"weigh_candidates": lambda situation: np.ones(7)}, lambda h: h.factors(SITUATION)),
        ({"weigh_candidates": lambda situation: [-1.0, 1.0]}, lambda h: h.factors(SITUATION)),
        ({"filter_candidates": lambda situation: [0.5, 1]}, lambda h: h.possible(SITUATION)),
        ({"report_sections": lambda document: [3]}, lambda h: h.report_sections({})),
        ({"gather_evidence": lambda image: {"A": "x"}}, lambda h: h.evidence(SITUATION, {})),
    ],
)
def test_failing_hook_is_named_and_the_others_still_count(broken, call):
    good = plugin(
        register_contexts=lambda: [Context("a", "A")],
        weigh_candidates=lambda situation: np.array([2.0, 2.0]),
    )
    made = host(plugin(**broken), good)
    call(made)
    assert [p.plugin for p in made.problems] == ["plugin 0"]
    assert len(made.contexts()) == 1
    assert made.factors(SITUATION)[0] == 2.0
    call(made)
    assert len(made.problems) <= 2  # a problem is told once


def test_files_that_fail_at_import_are_named_and_listed(tmp_path):
    (tmp_path / "good.py").write_text(
        '"""Adds Mars."""\n'
        "from phaseid.hooks import hookimpl\n"
        "from phaseid.phases.contexts import Context\n"
        "@hookimpl\n"
        "def register_contexts():\n"
        "    return [Context('mars', 'Mars')]\n",
        encoding="utf-8",
    )
    (tmp_path / "raises.py").write_text("raise RuntimeError('no luck')\n", encoding="utf-8")
    (tmp_path / "exits.py").write_text("import sys\nsys.exit(3)\n", encoding="utf-8")
    (tmp_path / "syntax.py").write_text("def (:\n", encoding="utf-8")
    (tmp_path / "misspelt.py").write_text(
        "from phaseid.hooks import hookimpl\n@hookimpl\ndef register_context():\n    return []\n",
        encoding="utf-8",
    )
    (tmp_path / "_hidden.py").write_text("raise SystemExit\n", encoding="utf-8")
    made = make_host(built_in=(), entry_points=False, folders=[tmp_path])
    assert [c.path for c in made.contexts()] == ["mars"]
    failed = {p.plugin: p.message for p in made.problems}
    assert set(failed) == {"file raises", "file exits", "file syntax", "file misspelt"}
    assert "no luck" in failed["file raises"]
    listing = {e["name"]: e for e in made.listing()}
    assert listing["file good"]["hooks"] == ["register_contexts"]
    assert listing["file good"]["summary"] == "Adds Mars."
    assert "no luck" in listing["file raises"]["problem"]
    assert "file _hidden" not in listing


def test_blocked_plugins_are_left_out(monkeypatch):
    monkeypatch.setenv("PHASEID_BLOCK", "phaseid_plugins.meteorite")
    paths = {c.path for c in make_host(entry_points=False, folders=[]).contexts()}
    assert "rock/meteorite/iron" not in paths
    assert "steel" in paths


@pytest.mark.parametrize("module", BUILT_IN)
def test_built_in_plugins_are_ordinary_and_documented(module):
    loaded = importlib.import_module(module)
    assert loaded.__doc__
    contexts = getattr(loaded, "CONTEXTS", ())
    assert all(c.title and c.description for c in contexts)
    for rule in getattr(loaded, "COEXISTENCE", ()):
        assert 0 < rule.factor < 1
        assert len(rule.reason) > 20


def test_what_ships_loads_without_a_problem_and_is_complete():
    made = make_host(entry_points=False, folders=[])
    assert made.problems == []
    assert len(made.contexts()) >= 60
    assert len(made.coexistence()) >= 8
    assert len(made.databases()) >= 8


def test_practice_favours_its_own_oxides():
    from phaseid_plugins.steel import practice_factors

    phases = (
        Phase("Alumina", "Al2O3", "x", contexts={"steel": "common"}),
        Phase("Silica", "SiO2", "x", contexts={"steel": "common"}),
        Phase("Kyanite", "Al2SiO5", "x", contexts={"rock": "common"}),
    )
    situation = Situation(
        Conditions(), ("steel/aluminium-killed",), phases, *(np.zeros(3) for _ in range(3))
    )
    assert practice_factors(situation).tolist() == [2.0, 1.0, 1.0]
    assert practice_factors(Situation(Conditions(), (), phases, *(np.zeros(3),) * 3)) is None
