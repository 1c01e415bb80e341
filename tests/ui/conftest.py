"""A small scene and an app on it, without a terminal."""

from __future__ import annotations

import asyncio
from contextlib import asynccontextmanager
from dataclasses import replace

import pytest

from phaseid.session.state import State
from phaseid.ui.actions import ACTIONS
from phaseid.ui.app import Triage
from phaseid.ui.work import Plan

from ..session.conftest import scene, scene_greys  # noqa: F401

STATE = State(energy_keV=20.0, contexts=("rock/sedimentary",))


async def settled(app, pilot):
    """Wait until no answer is being worked out."""
    for _ in range(600):
        await pilot.pause(0.05)
        if not app.bench.busy and app.bench.answered is not None:
            await pilot.pause()
            return
    raise AssertionError("the bench did not settle")


@pytest.fixture
def bench(scene, tmp_path, small_knowledge, monkeypatch):  # noqa: F811
    """Opens the app on a copy of the scene; knowledge is shared between tests."""
    from phaseid.session.knowledge import Knowledge

    monkeypatch.setattr(Knowledge, "load", classmethod(lambda cls, *a, **k: small_knowledge))
    copy = tmp_path / "scene.tif"
    copy.write_bytes(scene.read_bytes())

    @asynccontextmanager
    async def opened(size=(110, 36), state=STATE, sources=None, first_time=False, file=None):
        app = Triage(Plan(sources or (str(copy),), state, file), ACTIONS, first_time)
        async with app.run_test(size=size) as pilot:
            if state.energy_keV is not None:
                await settled(app, pilot)
            yield app, pilot

    opened.image = copy
    return opened


async def answer_dialog(pilot, text):
    """Type into the dialog that is open and take it."""
    await pilot.pause()
    for key in text:
        await pilot.press(
            {
                " ": "space",
                "=": "equals_sign",
                ",": "comma",
                ":": "colon",
                ".": "full_stop",
                "-": "minus",
            }.get(key, key)
        )
    await pilot.press("enter")
    await asyncio.sleep(0)
    await pilot.pause()


def with_energy(energy):
    return replace(STATE, energy_keV=energy)


def state_of(app):
    return app.bench.session.state


async def undone(app, pilot, before):
    """The last action can be taken back and done again."""
    after = state_of(app)
    assert after != before
    await pilot.press("u")
    await settled(app, pilot)
    assert state_of(app) == before
    await pilot.press("U")
    await settled(app, pilot)
    assert state_of(app) == after
