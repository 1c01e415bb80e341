"""Opening, reopening, stopping, and what is large or broken."""

from __future__ import annotations

import asyncio
import subprocess
import sys
import time
from dataclasses import replace

import numpy as np
import tifffile

from phaseid.session.state import State
from phaseid.session.store import load
from phaseid.ui.actions import ACTIONS
from phaseid.ui.app import Triage
from phaseid.ui.dialogs import Ask, Show
from phaseid.ui.work import Plan, session_file

from .conftest import STATE, answer_dialog, settled, state_of, undone


async def test_missing_energy_is_asked_for(bench):
    async with bench(state=replace(STATE, energy_keV=None)) as (app, pilot):
        for _ in range(200):
            await pilot.pause(0.05)
            if isinstance(app.screen, Ask):
                break
        await answer_dialog(pilot, "15")
        await settled(app, pilot)
        assert app.bench.answered.analysis.conditions.energy_keV == 15


async def test_reopens_where_it_was_left(bench):
    async with bench() as (app, pilot):
        await pilot.press("d")
        await answer_dialog(pilot, "20")
        await settled(app, pilot)
        kept = state_of(app)
    async with bench(state=State()) as (app, pilot):
        await settled(app, pilot)
        assert state_of(app) == kept
        await pilot.press("u")
        await settled(app, pilot)
        assert state_of(app).marks == ()


async def test_an_image_named_on_reopening_joins_the_session(bench, tmp_path):
    second = tmp_path / "second.tif"
    second.write_bytes(bench.image.read_bytes())
    async with bench() as (app, _):
        before = state_of(app)
    async with bench(sources=(str(bench.image), str(second))) as (app, pilot):
        assert len(state_of(app).images) == 2
        assert "Added second.tif" in str(app.bench.query_one("#said").content)
        assert load(session_file(bench.image))[0] == state_of(app)
        await undone(app, pilot, before)
    async with bench(sources=(str(bench.image), str(second))) as (app, _):
        assert len(state_of(app).images) == 2  # once, not again


async def test_changed_image_is_told_on_reopening(bench):
    async with bench():
        pass
    data = tifffile.imread(bench.image)
    data[:2] = 0
    tifffile.imwrite(bench.image, data)
    async with bench(state=State()) as (app, pilot):
        await settled(app, pilot)
        assert "image-changed" in [n.code for n in app.bench.answered.notices]


async def test_four_megapixels_do_not_freeze_the_screen(bench, tmp_path):
    rng = np.random.default_rng(0)
    big = tmp_path / "big.tif"
    tile = np.where(np.add.outer(np.arange(2048) // 128, np.arange(2048) // 128) % 2, 150, 70)
    tifffile.imwrite(big, np.clip(tile + rng.normal(0, 4, tile.shape), 0, 255).astype(np.uint8))
    app = Triage(Plan((str(big),), STATE), ACTIONS)
    async with app.run_test(size=(110, 36)) as pilot:
        # Not by the pilot: it waits until the process is idle, which a thread at work prevents.
        app.simulate_key("question_mark")
        gaps, last = [], time.perf_counter()
        opened_early = False
        while app.bench.answered is None and sum(gaps) < 60:
            await asyncio.sleep(0.01)
            now = time.perf_counter()
            gaps.append(now - last)
            last = now
            # The help opens while the image is being clustered.
            opened_early |= isinstance(app.screen, Show) and app.bench.answered is None
        assert opened_early
        assert max(gaps) < 1.0
        await pilot.press("escape")
        assert len(app.bench.clusters) == 2


async def test_work_can_be_stopped_and_begun_again(bench):
    async with bench() as (app, pilot):
        before, shown = state_of(app), app.bench.answered
        app.bench.mark("dark", grey=20.0)
        app.bench.mark("standard", "Cu", grey=180.0)
        assert app.bench.busy
        app.bench.action_stop()
        assert not app.bench.busy
        assert state_of(app) == before  # what was not answered is taken back, on disk as well
        assert load(session_file(bench.image))[0] == before
        assert "Stopped" in str(app.bench.query_one("#said").content)
        for _ in range(40):
            await pilot.pause(0.05)
        assert app.bench.answered is shown  # what comes late is dropped
        await pilot.press("U")
        await settled(app, pilot)
        assert [m.kind for m in state_of(app).marks] == ["dark"]
        app.bench.rank()
        app.bench.action_stop()
        await pilot.press("escape")
        await settled(app, pilot)
        assert app.bench.answered is not shown


async def test_stopping_after_an_undo_keeps_what_was_answered(bench):
    async with bench() as (app, pilot):
        app.bench.mark("dark", grey=20.0)
        await settled(app, pilot)
        before = state_of(app)
        app.bench.mark("standard", "Cu", grey=180.0)
        app.bench.action_undo()
        assert state_of(app) == before
        app.bench.action_stop()
        assert state_of(app) == before
        assert load(session_file(bench.image))[0] == before


def test_the_frame_stands_before_anything_heavy_is_loaded():
    code = "import sys, phaseid.ui.app; print(*sys.modules)"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    heavy = {"scipy", "sklearn", "pandas", "pymatgen", "matplotlib", "phaseid.image.clustering"}
    assert not heavy & set(done.stdout.split())


async def test_missing_or_broken_file_ends_with_one_sentence(bench, tmp_path):
    broken = tmp_path / "broken.tif"
    broken.write_text("no image", encoding="utf-8")
    app = Triage(Plan((str(broken),), STATE), ACTIONS)
    async with app.run_test() as pilot:
        for _ in range(200):
            await pilot.pause(0.05)
            if app.return_code is not None and app.bench.session is None and not app.bench.busy:
                break
    assert app.return_code == 2
