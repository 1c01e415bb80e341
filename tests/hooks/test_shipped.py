"""The plugins that ship: complete, sound, and in step with the databases."""

from __future__ import annotations

import importlib
import re
from collections import Counter
from pathlib import Path

import numpy as np
import pytest

from phaseid.errors import InputError
from phaseid.hooks.host import BUILT_IN, make_host
from phaseid.hooks.specs import Situation
from phaseid.hooks.testing import faults, host_of, situation_of, unknown_names
from phaseid.phases.records import Phase
from phaseid.physics.conditions import Conditions

ROOT = Path(__file__).resolve().parents[2]
FAMILIES = [
    "steel",
    "cast-iron",
    "nickel-alloy",
    "cobalt-alloy",
    "aluminium-alloy",
    "magnesium-alloy",
    "titanium-alloy",
    "copper-alloy",
    "zinc-alloy",
    "zirconium-alloy",
    "refractory-metal",
    "precious-metal",
    "hard-metal",
    "joint",
    "electronics",
    "magnet",
    "battery",
    "cement",
    "slag",
    "ash",
    "glass",
    "ceramic",
    "refractory",
    "coating",
    "pigment",
    "abrasive",
    "corrosion",
    "scale",
    "wear-debris",
    "dust",
    "preparation",
    "rock",
]


@pytest.fixture(scope="module")
def shipped():
    return make_host(entry_points=False, folders=[])


@pytest.mark.parametrize("module", BUILT_IN)
def test_built_in_plugins_are_ordinary_and_sound(module):
    loaded = importlib.import_module(module)
    assert loaded.__doc__
    assert faults(loaded) == []


def test_what_ships_loads_without_a_problem_and_is_complete(shipped):
    paths = {c.path for c in shipped.contexts()}
    assert shipped.problems == []
    assert set(FAMILIES) <= paths
    assert len(paths) >= 60
    assert len(shipped.databases()) >= 8


def test_contexts_are_defined_once_titled_and_described_in_a_sentence(shipped):
    contexts = shipped.contexts()
    assert Counter(c.path for c in contexts).most_common(1)[0][1] == 1
    for context in contexts:
        assert context.title[0].isupper() or context.title[0].isdigit()
        assert context.description.endswith(".")
        assert len(context.description.split()) >= 4, context.path
    titles = Counter(c.title for c in contexts)
    assert titles.most_common(1)[0][1] == 1


def test_every_context_above_another_is_defined_too(shipped):
    paths = {c.path for c in shipped.contexts()}
    assert {p.rsplit("/", 1)[0] for p in paths if "/" in p} <= paths


def test_every_last_part_is_found_by_itself_unless_it_is_shared(knowledge):
    tree = knowledge.contexts
    last = Counter(p.rsplit("/", 1)[-1] for p in tree.paths)
    for path in tree.paths:
        name = path.rsplit("/", 1)[-1]
        if last[name] == 1 or name == path:
            assert tree.resolve(name).path == path


def test_near_matches_are_told_once(knowledge):
    with pytest.raises(InputError, match=r"Did you mean steel[,?]") as told:
        knowledge.contexts.resolve("stel")
    assert str(told.value).count("steel") == 1


def test_databases_use_only_contexts_that_are_defined(knowledge):
    used = {c for p in knowledge.catalogue.phases for c in p.contexts}
    assert used <= set(knowledge.contexts.paths)


def test_every_context_favours_some_phases_and_not_all(knowledge):
    phases = knowledge.catalogue.phases
    for path in knowledge.contexts.paths:
        if path == "preparation":
            continue
        weights = knowledge.contexts.weights([path], phases)
        likely = int((weights >= 0.03).sum())
        assert 3 <= likely < 0.6 * len(phases), (path, likely)


def test_coexistence_rules_have_reasons_places_and_known_names(knowledge):
    rules = knowledge.host.coexistence()
    assert len(rules) >= 30
    paths = set(knowledge.contexts.paths)
    for rule in rules:
        assert 0 < rule.factor < 1
        assert rule.reason.endswith((".", ")"))
        assert "(" in rule.reason or "common practice" in rule.reason
        assert set(rule.where) <= paths
    assert unknown_names(rules, knowledge.catalogue.index) == []


def test_a_rule_holds_only_where_things_react(knowledge):
    (rule,) = (
        r
        for r in knowledge.host.coexistence()
        if "Quartz" in r.first and "Nepheline" in r.second and "rock/igneous" in r.where
    )
    assert rule.holds(["rock/igneous/granite"])
    assert not rule.holds(["rock/soil"])
    assert not rule.holds(["rock/igneous/granite", "dust/mineral"])
    assert not rule.holds([])


def test_rules_reach_the_ranking_as_pairs(knowledge):
    candidates = knowledge.candidates(Conditions())
    pair = tuple(sorted((candidates.index("Quartz"), candidates.index("Nepheline"))))
    assert knowledge.coexistence(candidates, ["syenite"])[pair] == pytest.approx(0.05)
    assert pair not in knowledge.coexistence(candidates, ["soil"])


def test_practice_favours_its_own_oxides():
    from phaseid_plugins.steel import practice_factors

    phases = (
        Phase("Alumina", "Al2O3", "x", contexts={"steel": "common"}),
        Phase("Silica", "SiO2", "x", contexts={"steel": "common"}),
        Phase("Kyanite", "Al2SiO5", "x", contexts={"rock": "common"}),
    )
    situation = situation_of(phases, contexts=["steel/aluminium-killed"])
    assert practice_factors(situation).tolist() == [2.0, 1.0, 1.0]
    assert practice_factors(situation_of(phases)) is None


def test_practice_changes_the_weights_of_a_ranking(knowledge):
    from phaseid.session.state import State

    candidates = knowledge.candidates(Conditions())
    spinel, iron = candidates.index("Spinel"), candidates.index("Magnetite")
    plain = knowledge.contexts.weights(["steel/aluminium-killed"], candidates.phases)
    prior = knowledge.prior(
        State(contexts=("steel/aluminium-killed",), site_knowledge=False), candidates
    )
    assert prior[spinel] / plain[spinel] == pytest.approx(2.0)
    assert prior[iron] / plain[iron] == pytest.approx(1.0)


def test_helpers_name_what_is_wrong():
    from phaseid.hooks.testing import plugin_of
    from phaseid.physics.elemental import BackscatterModel

    def steep(z, energy_keV):
        return z / 10

    wrong = BackscatterModel("steep", steep, None, (4.0, 92.0), "a test", "")
    assert "outside 0 to 1" in faults(plugin_of(register_backscatter_models=lambda: [wrong]))[0]
    assert "ZeroDivisionError" in faults(plugin_of(weigh_candidates=lambda situation: 1 / 0))[0]
    assert "no function marked" in faults(object())[0]
    assert isinstance(situation_of(["SiO2"]), Situation)
    assert np.isclose(situation_of(["SiO2"]).mean_atomic_number[0], 10.8, atol=0.1)


def test_the_example_of_the_documentation_is_a_sound_plugin(knowledge, tmp_path):
    text = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
    example = tmp_path / "welds.py"
    example.write_text(re.search(r"```python\n(.+?)```", text, re.DOTALL)[1], encoding="utf-8")
    assert faults(example) == []
    host = host_of(example)
    assert unknown_names(host.coexistence(), knowledge.catalogue.index) == []
    (context,) = host.contexts()
    assert all(knowledge.catalogue.index(name) is not None for name in context.weights)
