"""Every action of the bench and its undo, on the state; what is shown; what goes wrong."""

from __future__ import annotations

import json

import pytest

from phaseid.errors import InputError
from phaseid.session.store import load
from phaseid.ui.actions import ACTIONS, remapped
from phaseid.ui.dialogs import Ask, Pick, PickSeveral, Show
from phaseid.ui.widgets import CandidateList, ClusterList, GreyAxis, Picture
from phaseid.ui.work import session_file

from .conftest import answer_dialog, scene_greys, settled, state_of, undone


async def test_first_answer_is_on_the_screen(bench):
    async with bench() as (app, _):
        assert app.bench.query_one(ClusterList).row_count == 3
        assert app.bench.query_one(CandidateList).row_count >= 5
        axis = app.bench.query_one(GreyAxis)
        kinds = {line.kind for line in axis.lines}
        assert kinds == {"histogram", "clusters", "scale", "candidate"}
        assert app.bench.query_one(Picture).answered is not None
        saved, _ = load(session_file(bench.image))
        assert saved == state_of(app)


async def test_know_and_forget(bench):
    async with bench() as (app, pilot):
        app.bench.select(app.bench.clusters[0].id)
        before = state_of(app)
        await pilot.press("k")
        assert isinstance(app.screen, Pick)
        await answer_dialog(pilot, "quartz")
        await settled(app, pilot)
        assert app.bench.clusters[0].known == "Quartz"
        await undone(app, pilot, before)
        app.bench.select(app.bench.clusters[0].id)
        await pilot.press("K")
        await settled(app, pilot)
        assert app.bench.clusters[0].known is None


async def test_elements_seen_and_not_seen(bench):
    async with bench() as (app, pilot):
        app.bench.select(app.bench.clusters[1].id)
        before = state_of(app)
        await pilot.press("x")
        await answer_dialog(pilot, "Ca, C")
        await settled(app, pilot)
        assert app.bench.clusters[1].seen == ("Ca", "C")
        await undone(app, pilot, before)
        await pilot.press("X")
        await answer_dialog(pilot, "Si")
        await settled(app, pilot)
        assert app.bench.clusters[1].unseen == ("Si",)
        before = state_of(app)
        await pilot.press("y")
        await answer_dialog(pilot, "Ca=40, C=12")
        await settled(app, pilot)
        assert state_of(app).marks[-1].value == "Ca=40,C=12"
        await undone(app, pilot, before)


async def test_standard_and_dark_level(bench):
    async with bench() as (app, pilot):
        before = state_of(app)
        await pilot.press("s")
        await answer_dialog(pilot, f"{scene_greys()[2]:.0f}=Fe3O4")
        await settled(app, pilot)
        await undone(app, pilot, before)
        before = state_of(app)
        await pilot.press("d")
        await answer_dialog(pilot, "20")
        await settled(app, pilot)
        await undone(app, pilot, before)
        assert len(app.bench.answered.analysis.scale.references) == 2


async def test_contexts(bench):
    async with bench() as (app, pilot):
        before = state_of(app)
        await pilot.press("c")
        assert isinstance(app.screen, PickSeveral)
        await pilot.press("space", "enter")
        await settled(app, pilot)
        assert len(state_of(app).contexts) == 2
        await undone(app, pilot, before)


async def test_conditions(bench):
    async with bench() as (app, pilot):
        before = state_of(app)
        await pilot.press("e")
        await pilot.press("end")
        await answer_dialog(pilot, " coat=C:15 tilt=5")
        await settled(app, pilot)
        assert state_of(app).coat == "C:15"
        assert state_of(app).tilt_deg == 5
        await undone(app, pilot, before)


async def test_model_tells_what_it_changes(bench):
    async with bench() as (app, pilot):
        before = state_of(app)
        await pilot.press("m")
        await answer_dialog(pilot, "reuter")
        for _ in range(100):
            await pilot.pause(0.05)
            if isinstance(app.screen, Show):
                break
        assert "->" in app.screen.text
        await pilot.press("escape")
        await settled(app, pilot)
        assert state_of(app).model == "reuter-1972"
        await undone(app, pilot, before)


async def test_accept_reject_list(bench):
    async with bench() as (app, pilot):
        app.bench.query_one(CandidateList).focus()
        name = app.bench.chosen.name
        for key, kind, note in (("a", "accepted", "by habit"), ("r", "rejected", "no cleavage")):
            before = state_of(app)
            await pilot.press(key)
            assert isinstance(app.screen, Ask)
            await answer_dialog(pilot, note)
            await settled(app, pilot)
            (mark,) = state_of(app).marked(kind)
            assert (mark.value, mark.note) == (name, note)
            await undone(app, pilot, before)
        before = state_of(app)
        await pilot.press("l")
        await answer_dialog(pilot, "uraninite")
        await settled(app, pilot)
        assert "Uraninite" in [c.name for c in app.bench.cluster.candidates]
        await undone(app, pilot, before)


async def test_compare_and_explain(bench):
    async with bench() as (app, pilot):
        app.bench.query_one(CandidateList).focus()
        await pilot.press("w")
        assert "bits" in app.screen.text
        await pilot.press("escape")
        await pilot.press("v")
        await pilot.press("enter")
        await pilot.pause()
        assert isinstance(app.screen, Show)
        assert "X-ray" in app.screen.text or "diffraction" in app.screen.text


async def test_merge_split_boundary_count(bench):
    async with bench() as (app, pilot):
        count = len(app.bench.clusters)
        app.bench.select(app.bench.clusters[0].id)
        for keys, expected in (
            (("g", "enter"), count - 1),
            (("t", "enter"), count + 1),
        ):
            before = state_of(app)
            app.bench.select(app.bench.clusters[0].id)
            await pilot.press(keys[0])
            await pilot.pause()
            await pilot.press(keys[1])
            await settled(app, pilot)
            assert len(app.bench.clusters) == expected
            await undone(app, pilot, before)
            await pilot.press("u")
            await settled(app, pilot)
        before = state_of(app)
        await pilot.press("N")
        await answer_dialog(pilot, "2")
        await settled(app, pilot)
        assert len(app.bench.clusters) == 2
        await undone(app, pilot, before)
        await pilot.press("b")
        await pilot.pause()
        await pilot.press("enter")
        await answer_dialog(pilot, f"{scene_greys()[1]:.0f}")
        await settled(app, pilot)
        assert state_of(app).edits[-1].kind == "boundary"


async def test_rename_and_leave_out(bench):
    async with bench() as (app, pilot):
        app.bench.select(app.bench.clusters[2].id)
        before = state_of(app)
        await pilot.press("n")
        await answer_dialog(pilot, "rim")
        await settled(app, pilot)
        assert app.bench.clusters[2].name == "rim"
        await undone(app, pilot, before)
        before = state_of(app)
        await pilot.press("o")
        await settled(app, pilot)
        assert app.bench.clusters[2].observation is None
        await undone(app, pilot, before)
        app.bench.select(app.bench.clusters[2].id)
        await pilot.press("o")
        await settled(app, pilot)
        assert app.bench.clusters[2].observation is not None


async def test_excluded_area_and_point_under_the_cursor(bench):
    async with bench() as (app, pilot):
        picture = app.bench.query_one(Picture)
        await pilot.click(Picture, offset=(20, 5))
        first = picture.cursor
        assert first is not None
        assert "grey" in str(app.bench.query_one("#said").content)
        await pilot.press("f")
        label = int(app.bench.answered.clustering.labels[first])
        assert app.bench.selected == label
        before = state_of(app)
        await pilot.press("z")
        picture.focus()
        for _ in range(4):
            await pilot.press("down", "right")
        await pilot.press("z")
        await settled(app, pilot)
        assert state_of(app).edits[-1].kind == "rectangle"
        await undone(app, pilot, before)


async def test_zoom_keeps_the_cursor_in_view(bench):
    async with bench() as (app, pilot):
        picture = app.bench.query_one(Picture)
        await pilot.press("plus", "plus")
        assert picture.view.zoom == pytest.approx(1.6**2)
        await pilot.press("minus", "minus")
        assert picture.view.zoom == pytest.approx(1.0)


async def test_series_and_same_settings(bench, tmp_path):
    second = tmp_path / "second.tif"
    second.write_bytes(bench.image.read_bytes())
    async with bench(sources=(str(bench.image), str(second))) as (app, pilot):
        await pilot.press("i")
        await settled(app, pilot)
        assert app.bench.index == 1
        before = state_of(app)
        await pilot.press("S")
        await settled(app, pilot)
        assert app.bench.answered.analysis.images == (0, 1)
        await undone(app, pilot, before)


async def test_site_knowledge_toggle(bench):
    async with bench() as (app, pilot):
        before = state_of(app)
        await pilot.press("L")
        await settled(app, pilot)
        assert state_of(app).site_knowledge
        await undone(app, pilot, before)


async def test_notices_advice_help_are_readable(bench):
    async with bench() as (app, pilot):
        for key, word in (
            ("f3", "bits"),
            ("question_mark", "Take the last action back"),
            ("f2", ""),
        ):
            await pilot.press(key)
            await pilot.pause()
            assert isinstance(app.screen, Show)
            assert word in app.screen.text
            await pilot.press("escape")


async def test_export_writes_the_same_files(bench):
    async with bench() as (app, pilot):
        await pilot.press("p")
        for _ in range(200):
            await pilot.pause(0.05)
            if "Wrote" in str(app.bench.query_one("#said").content):
                break
        folder = bench.image.parent / "scene-candidates"
        made = json.loads((folder / "candidates.json").read_text(encoding="utf-8"))
        assert made["schema"] == "phaseid-candidates/1"
        assert {p.name for p in folder.iterdir()} >= {"candidates.csv", "figure.png", "labels.tif"}


async def test_wrong_answers_are_told_and_change_nothing(bench):
    async with bench() as (app, pilot):
        before = state_of(app)
        for key, text, word in (
            ("s", "copper", "GREY=FORMULA"),
            ("d", "black", "no grey"),
            ("N", "many", "whole number"),
            ("e", "weather=fine", "not one of"),
        ):
            await pilot.press(key)
            await pilot.press("ctrl+u")
            await answer_dialog(pilot, text)
            assert word in str(app.bench.query_one("#said").content)
            assert state_of(app) == before
        await pilot.press("x")
        await answer_dialog(pilot, "Qq")
        await settled(app, pilot)
        assert state_of(app) == before  # taken back, on disk as well
        assert load(session_file(bench.image))[0] == before


@pytest.mark.parametrize("size", [(80, 24), (200, 60)])
async def test_small_and_wide_screens(bench, size):
    async with bench(size=size) as (app, _):
        axis = app.bench.query_one(GreyAxis)
        assert any(line.kind == "candidate" for line in axis.lines)
        assert axis.size.width > size[0] - 6
        assert app.bench.max_scroll_y == 0
        assert app.bench.query_one("#footer").max_scroll_x == 0
        assert app.bench.query_one(CandidateList).size.height >= 3


async def test_no_colour_and_light_theme(bench, monkeypatch):
    monkeypatch.setenv("NO_COLOR", "1")
    async with bench() as (app, pilot):
        app.theme = "textual-light"
        await pilot.pause()
        marks = next(
            line.text for line in app.bench.query_one(GreyAxis).lines if line.kind == "clusters"
        )
        assert f"[{app.bench.selected}]" in marks


async def test_first_run_hint(bench):
    async with bench(first_time=True) as (app, pilot):
        await pilot.pause()
        assert isinstance(app.screen, Show)
        assert len(app.screen.text.splitlines()) == 5


def test_keys_can_be_remapped(tmp_path):
    path = tmp_path / "keys.txt"
    path.write_text("know = j  # mine\n\n", encoding="utf-8")
    assert next(a.key for a in remapped(path) if a.name == "know") == "j"
    path.write_text("know = u\n", encoding="utf-8")
    with pytest.raises(InputError, match="given to two"):
        remapped(path)
    path.write_text("fly = j\n", encoding="utf-8")
    with pytest.raises(InputError, match="line 1"):
        remapped(path)


async def test_every_action_exists_and_is_in_the_palette(bench):
    async with bench() as (app, _):
        commands = {c.title for c in app.get_system_commands(app.screen)}
        for action in ACTIONS:
            assert callable(getattr(app.bench, f"action_{action.name}"))
            assert action.label in commands
            assert action.help.endswith(".")
    keys = [a.key for a in ACTIONS]
    assert len(keys) == len(set(keys))
