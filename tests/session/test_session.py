"""The session: evidence, undo, saving, series, edits, site knowledge."""

from __future__ import annotations

import json
import multiprocessing
from dataclasses import replace

import numpy as np
import pytest
import tifffile

from phaseid.errors import InputError
from phaseid.inference.explain import explain
from phaseid.session.candidates import VOID
from phaseid.session.learned import Learned, learned_weights
from phaseid.session.state import Mark, State, from_json, to_json
from phaseid.session.store import load, looks_like_session
from phaseid.session.work import Session

from .conftest import scene_greys


def named(answer, cluster):
    return {c.name: c.probability for c in answer.clusters[cluster].candidates}


def test_known_phases_settle_the_rest(session):
    greys = scene_greys()
    state = session.with_mark("known", greys[0], "Quartz")
    session.apply("quartz", state)
    session.apply("magnetite", session.with_mark("known", greys[2], "Magnetite"))
    (answer,) = session.answers(top=12)
    assert [c.known for c in answer.clusters] == ["Quartz", None, "Magnetite"]
    assert "Calcite" in named(answer, 1)
    assert answer.clusters[0].candidates[0].probability == 1.0
    assert answer.scale.gain == pytest.approx(1300, rel=0.1)
    assert len(answer.scale.references) == 2
    assert all(m.cluster == 1 for m in answer.advice)


def test_standard_and_dark_level_fix_the_scale(session):
    session.apply("dark", session.with_mark("dark", 20.0))
    greys = scene_greys()
    session.apply("standard", session.with_mark("standard", float(greys[2]), "Fe3O4"))
    (answer,) = session.answers(top=20)
    assert answer.scale.offset == pytest.approx(20, abs=3)
    assert {"Magnetite", "Hematite"} & set(named(answer, 2))


def test_elements_change_the_list(session):
    greys = scene_greys()
    session.apply("known", session.with_mark("known", greys[0], "Quartz"))
    session.apply("seen", session.with_mark("seen", greys[1], "Ca,C"))
    session.apply("unseen", session.with_mark("unseen", greys[1], "Mg,S,P,Si"))
    (answer,) = session.answers(top=10)
    assert named(answer, 1)["Calcite"] > 0.2
    assert answer.clusters[1].seen == ("Ca", "C")
    told = explain(
        answer.ranking, answer.clusters[1].observation, answer.clusters[1].candidates[0].phase
    )
    assert {t.name: t.bits for t in told.terms}["evidence"] < 0


def test_rejected_accepted_listed_named_ignored(session):
    greys = scene_greys()
    (before,) = session.answers()
    first = before.clusters[1].candidates[0].name
    session.apply("no", session.with_mark("rejected", greys[1], first, "cleavage is wrong"))
    session.apply("yes", session.with_mark("accepted", greys[0], "Quartz", "by habit"))
    session.apply("show", session.with_mark("listed", greys[1], "Uraninite"))
    session.apply("name", session.with_mark("named", greys[1], "cement"))
    session.apply("out", session.with_mark("ignored", greys[2]))
    (after,) = session.answers()
    assert named(after, 1).get(first, 0.0) == 0.0
    assert "Uraninite" in named(after, 1)
    assert after.clusters[0].accepted == "Quartz"
    assert after.clusters[1].name == "cement"
    assert after.clusters[2].observation is None
    assert after.clusters[2].candidates == ()


def test_formula_that_no_database_has_can_be_known(session):
    greys = scene_greys()
    session.apply("x", session.with_mark("known", greys[2], "Fe3O3.9"))
    (answer,) = session.answers()
    assert answer.clusters[2].known == "Fe3O3.9"


@pytest.mark.parametrize(
    ("marks", "word"),
    [
        ([Mark("known", 95, "Unobtainium")], "No phase is called"),
        ([Mark("known", 4000, "Quartz")], "No cluster lies near"),
        ([Mark("known", None, "Quartz"), Mark("known", None, "Au")], "given as both"),
        ([Mark("seen", None, "Qq")], "Qq"),
        ([Mark("seen", None, "Fe"), Mark("unseen", None, "Fe")], "both seen and not seen"),
        ([Mark("standard", 100, "Qq2")], "Qq"),
        ([Mark("content", None, "Fe60")], "no content"),
        ([Mark("content", None, "Qq=60")], "Qq"),
    ],
)
def test_evidence_that_cannot_be_used_is_refused_and_nothing_changes(session, marks, word):
    first = float(scene_greys()[0])
    marks = tuple(replace(m, grey=first if m.grey is None else m.grey) for m in marks)
    before = session.state
    with pytest.raises(InputError, match=word):
        session.attempt("wrong", replace(before, marks=marks))
    assert session.state == before


def test_reversed_known_phases_are_refused(session):
    greys = scene_greys()
    session.apply("a", session.with_mark("known", greys[0], "Au"))
    with pytest.raises(InputError, match="contradicts itself"):
        session.attempt("b", session.with_mark("known", greys[2], "Quartz"))


def test_undo_and_redo_go_through_every_step(session, tmp_path):
    session.file = tmp_path / "work.phaseid.json"
    states = [session.state]
    for grey, phase in ((scene_greys()[0], "Quartz"), (scene_greys()[2], "Magnetite")):
        session.apply(f"known {phase}", session.with_mark("known", grey, phase))
        states.append(session.state)
    assert session.undo() == "known Magnetite"
    assert session.state == states[1]
    assert session.undo() == "known Quartz"
    assert session.state == states[0]
    assert session.undo() is None
    assert session.redo() == "known Quartz"
    assert session.redo() == "known Magnetite"
    assert session.state == states[2]
    assert session.redo() is None
    session.undo()
    session.apply("other", session.with_mark("dark", 12.0))
    assert session.redo() is None


def test_every_action_is_on_disk_at_once(session, tmp_path, small_knowledge):
    session.file = tmp_path / "work.phaseid.json"
    session.apply("one", session.with_mark("dark", 20.0))
    session.apply("two", session.with_edit("count", [4]))
    again = Session.reopen(session.file, small_knowledge)
    assert again.state == session.state
    assert again.history == session.history
    assert again.undo() == "two"
    assert looks_like_session(session.file)
    assert json.loads(session.file.read_text(encoding="utf-8"))["schema"] == "phaseid-session/1"


@pytest.mark.parametrize(
    ("change", "word"),
    [
        (lambda t: t[: len(t) // 2], "not valid JSON"),
        (lambda t: "[]", "not a session"),
        (lambda t: t.replace("phaseid-session/1", "phaseid-session/9"), "update phaseid"),
        (lambda t: t.replace('"tilt_deg": null', '"tilt_deg": "steep"'), "tilt_deg"),
        (lambda t: t.replace('"tilt_deg"', '"tlit_deg"'), "tlit_deg"),
        (lambda t: t.replace('"kind": "dark"', '"kind": "bright"'), "bright"),
        (lambda t: "\x00", "not"),
    ],
)
def test_broken_session_files_are_refused(session, tmp_path, change, word):
    session.file = tmp_path / "work.json"
    session.apply("one", session.with_mark("dark", 20.0))
    text = session.file.read_text(encoding="utf-8")
    session.file.write_text(change(text), encoding="utf-8")
    with pytest.raises(InputError, match=word):
        load(session.file)
    with pytest.raises(InputError, match="Cannot read"):
        load(tmp_path / "missing.json")


def test_state_survives_json_to_the_last_field():
    state = State(
        energy_keV=15.0, coat="C:15", contexts=("a",), marks=(Mark("seen", 1.0, "Fe", "n", 2),)
    )
    assert from_json(json.loads(json.dumps(to_json(state))), "x") == state


def test_changed_image_is_told(session, scene, tmp_path):
    copy = tmp_path / "copy.tif"
    copy.write_bytes(scene.read_bytes())
    session.state = replace(session.with_image(copy), images=())
    session.state = session.with_image(copy)
    data = tifffile.imread(copy)
    data[0, 0] += 1
    tifffile.imwrite(copy, data)
    session.pictures.__init__()
    assert session.notices(0)[0].code == "image-changed"


def test_edits_of_clusters_act_and_come_back(session):
    greys = scene_greys()
    count = len(session.clustering(0).clusters)
    session.apply("merge", session.with_edit("merge", [greys[0], greys[1]]))
    assert len(session.clustering(0).clusters) == count - 1
    merged = session.clustering(0).clusters[0].grey_mean
    session.apply("split", session.with_edit("split", [merged, 2]))
    assert len(session.clustering(0).clusters) == count
    session.undo()
    session.undo()
    session.apply("count", session.with_edit("count", [2]))
    assert len(session.clustering(0).clusters) == 2
    session.undo()
    session.apply("area", session.with_edit("rectangle", [0, 0, 60, 192]))
    assert not session.clustering(0).labels[:60].any()
    session.undo()
    assert len(session.clustering(0).clusters) == count
    with pytest.raises(InputError, match="rectangle"):
        session.attempt("area", session.with_edit("rectangle", [5000, 0, 60, 60]))


def test_series_shares_one_scale(session, scene, tmp_path):
    greys = scene_greys()
    data = tifffile.imread(scene).astype(float)
    brighter = tmp_path / "brighter.tif"
    tifffile.imwrite(brighter, np.clip(data * 1.04 + 3, 0, 255).round().astype(np.uint8))
    session.state = replace(session.with_image(brighter), same_settings=True)
    session.apply("known", session.with_mark("known", greys[0], "Quartz"))
    session.apply("known", session.with_mark("known", greys[2], "Magnetite"))
    (answer,) = session.answers()
    assert answer.images == (0, 1)
    assert [c.known for c in answer.of_image(1)] == ["Quartz", None, "Magnetite"]
    assert "drift" in [n.code for n in answer.notices]
    assert answer.drift[1, 0] == pytest.approx(1.04, abs=0.02)
    pooled = [c.observation for c in answer.clusters]
    assert pooled[:3] == pooled[3:]


def test_hole_is_a_candidate_of_dark_clusters(session):
    greys = scene_greys()
    session.apply("dark", session.with_mark("dark", float(greys[0]) - 6))
    session.apply("known", session.with_mark("known", greys[2], "Magnetite"))
    (answer,) = session.answers()
    assert VOID in named(answer, 0)


def test_missing_energy_is_asked_for(session):
    session.state = replace(session.state, energy_keV=None)
    with pytest.raises(InputError, match="--energy"):
        session.answers()


def _accept(path, worker):
    for n in range(20):
        Learned(path).accept(["steel"], f"P{worker}", f"sha{worker}-{n}", n)


def test_site_knowledge_counts_and_is_safe_for_several_processes(tmp_path):
    path = tmp_path / "learned.sqlite"
    context = multiprocessing.get_context("spawn")
    workers = [context.Process(target=_accept, args=(path, w)) for w in range(3)]
    for worker in workers:
        worker.start()
    for worker in workers:
        worker.join()
    store = Learned(path)
    assert {(c.phase, c.count) for c in store.counts()} == {("P0", 20), ("P1", 20), ("P2", 20)}
    store.accept(["steel"], "P9", "sha0-0", 0)  # a second word on the same cluster
    assert {c.phase: c.count for c in store.counts(["steel"])}["P0"] == 19
    store.withdraw("sha0-0", 0)
    assert store.clear("steel") == 59
    assert store.counts() == []


def test_broken_site_file_is_told(tmp_path):
    path = tmp_path / "learned.sqlite"
    path.write_text("this is no database, and long enough to be noticed as none", encoding="utf-8")
    with pytest.raises(InputError, match="PHASEID_LEARNED"):
        Learned(path).counts()


def test_learned_weights_are_a_dirichlet_mean():
    from phaseid.session.learned import STRENGTH, Count

    weights = np.array([1.0, 0.3, 0.1])
    same = learned_weights(weights, {"a": 0}, [])
    np.testing.assert_allclose(same, weights)
    counted = learned_weights(
        weights, {"a": 0, "b": 1}, [Count("x", "b", 10), Count("x", "gone", 5)]
    )
    expected = (STRENGTH * 0.3 / 1.4 + 10) / (STRENGTH + 10)
    assert counted[1] / counted.sum() == pytest.approx(expected)


def test_site_knowledge_moves_the_ranking_only_when_switched_on(session, small_knowledge, tmp_path):
    greys = scene_greys()
    small_knowledge.learned = Learned(tmp_path / "l.sqlite")
    for n in range(200):
        small_knowledge.learned.accept(["rock/sedimentary"], "Dolomite", f"sha{n}", 1.0)
    session.apply("known", session.with_mark("known", greys[2], "Magnetite"))
    (off,) = session.answers(top=100)
    session.state = replace(session.state, site_knowledge=True)
    (on,) = session.answers(top=100)
    assert named(on, 0)["Dolomite"] > 2 * named(off, 0).get("Dolomite", 0.0)
