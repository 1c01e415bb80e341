"""Plugins: every hook is called, a broken plugin is named and skipped, order does not matter."""

from __future__ import annotations

import inspect
import sys
from dataclasses import replace
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest

from phaseid.hooks import hookimpl, specs
from phaseid.hooks.host import default_folders, make_host
from phaseid.hooks.specs import ClusterSummary, ReportSection, Situation
from phaseid.hooks.testing import hook_names, host_of, plugin_of
from phaseid.phases.contexts import Coexistence, Context
from phaseid.phases.records import Phase
from phaseid.physics.conditions import Conditions
from phaseid.physics.elemental import BackscatterModel, elemental_eta, models

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
HOOKS = hook_names()


plugin, host = plugin_of, host_of


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


def test_gather_evidence_for_all_clusters_or_each():
    clusters = tuple(ClusterSummary(g, 0.1, 2.0, 0.5, 100, 3) for g in (50.0, 90.0))
    situation = replace(SITUATION, clusters=clusters)
    one = plugin(gather_evidence=lambda situation, image: {"A": 2.0} if image["path"] else {})
    two = plugin(gather_evidence=lambda image: {"A": 2.0, "B": [1.0, 0.5]})
    found = host(one, two).evidence(situation, {"path": "x"})
    assert {name: factors.tolist() for name, factors in found.items()} == {
        "A": [4.0, 4.0],
        "B": [1.0, 0.5],
    }


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
        ({"gather_evidence": lambda image: {"A": [1.0] * 5}}, lambda h: h.evidence(SITUATION, {})),
        ({"register_contexts": lambda: sys.exit(3)}, lambda h: h.contexts()),
        ({"register_databases": lambda: "lab.yaml"}, lambda h: h.databases()),
        ({"register_backscatter_models": lambda: [3]}, lambda h: h.backscatter_models()),
        ({"register_backscatter_models": lambda: models()}, lambda h: h.backscatter_models()),
        (
            {"register_coexistence": lambda: [Coexistence("A", "B", 0.1, "")]},
            lambda h: h.coexistence(),
        ),
        ({"register_contexts": lambda: [Context("Steel works", "x")]}, lambda h: h.contexts()),
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


def test_files_with_dataclasses_and_doubled_names_and_missing_folders(tmp_path):
    first, second = tmp_path / "first", tmp_path / "second"
    for folder in (first, second):
        folder.mkdir()
        (folder / "lab.py").write_text(
            "from __future__ import annotations\n"
            "from dataclasses import dataclass\n"
            "from phaseid.hooks import hookimpl\n"
            "from phaseid.phases.contexts import Context\n"
            "@dataclass\n"
            "class Kind:\n"
            "    path: str\n"
            "@hookimpl\n"
            "def register_contexts():\n"
            f"    return [Context(Kind({folder.name!r}).path, 'Title')]\n",
            encoding="utf-8",
        )
    made = make_host(built_in=(), entry_points=False, folders=[first, second, tmp_path / "none"])
    assert [c.path for c in made.contexts()] == ["first"]
    told = {p.plugin: p.message for p in made.problems}
    assert str(second / "lab.py") in told["file lab"]
    assert "no such plugin folder" in told[str(tmp_path / "none")]
    assert {e["name"] for e in made.listing()} == set(told)


def test_environment_names_folders_and_files(tmp_path, monkeypatch):
    file = tmp_path / "one.py"
    file.write_text('"""Does nothing."""\n', encoding="utf-8")
    monkeypatch.setenv("PHASEID_PLUGINS", str(file))
    assert default_folders() == [file]
    made = make_host(built_in=(), entry_points=False)
    assert [e["name"] for e in made.listing()] == ["file one"]


def test_entry_points_are_loaded_and_a_broken_one_is_named(monkeypatch):
    class Point:
        dist = SimpleNamespace(name="lab-package")

        def __init__(self, name, load):
            self.name, self.load = name, load

    points = [
        Point("good", lambda: plugin(register_contexts=lambda: [Context("lab", "Lab")])),
        Point("bad", lambda: 1 / 0),
        Point("blocked", lambda: 1 / 0),
    ]
    monkeypatch.setattr("importlib.metadata.entry_points", lambda group: points)
    made = make_host(built_in=(), folders=[], blocked=["blocked"])
    assert [c.path for c in made.contexts()] == ["lab"]
    listing = {e["name"]: e for e in made.listing()}
    assert listing["good"]["origin"] == "installed with lab-package"
    assert "ZeroDivisionError" in listing["bad"]["problem"]
    assert "blocked" not in listing


def test_wrappers_and_wrong_arguments_are_refused_at_once():
    def around():
        yield

    def wants_more(situation, colour):
        return None

    wrapper = SimpleNamespace(register_contexts=hookimpl(wrapper=True)(around))
    made = host(wrapper, plugin(weigh_candidates=wants_more))
    told = {p.plugin: p.message for p in made.problems}
    assert "wrapper" in told["plugin 0"]
    assert "colour" in told["plugin 1"]
    assert made.contexts() == []
    assert made.factors(SITUATION).tolist() == [1.0, 1.0]


def test_what_ships_comes_first_whatever_it_is_called():
    made = make_host(
        built_in=("phaseid_plugins.databases",),
        entry_points=False,
        folders=[],
        extra={"a": plugin(register_databases=lambda: ["lab.yaml"])},
    )
    assert made.databases()[-1] == Path("lab.yaml")
    assert made.databases_by_plugin()[-1] == ("a", Path("lab.yaml"))
    assert len(made.databases()) > 8


def test_a_plugin_cannot_change_what_others_see():
    def scribble(situation):
        situation.signal[:] = 0.0

    made = host(plugin(weigh_candidates=scribble))
    made.factors(SITUATION)
    assert "read-only" in made.problems[0].message
    assert SITUATION.signal[0] == 0.1
