"""Draw the picture of the screen in the README: a real run on the shipped example, without a terminal.

Run: python examples/make_screen_picture.py
"""

from __future__ import annotations

import asyncio
import shutil
import tempfile
from dataclasses import replace
from pathlib import Path

from phaseid.session.state import Mark, State
from phaseid.ui.actions import ACTIONS
from phaseid.ui.app import Triage
from phaseid.ui.work import Plan

HERE = Path(__file__).parent
SIZE = (112, 38)


async def main() -> None:
    with tempfile.TemporaryDirectory() as folder:
        image = Path(folder) / "scene.tif"
        shutil.copy(HERE / "shaft" / "scene.tif", image)
        state = State(
            energy_keV=20.0,
            contexts=("steel/aluminium-killed",),
            marks=(Mark("known", 205.0, "Ferrite"), Mark("dark", 12.0)),
        )
        app = Triage(Plan((str(image),), replace(state)), ACTIONS)
        async with app.run_test(size=SIZE) as pilot:
            while app.bench.answered is None or app.bench.busy:
                await pilot.pause(0.1)
            app.bench.select(app.bench.clusters[1].id)
            app.bench.say(app.bench._summary())
            await pilot.pause(0.3)
            (HERE / "screen.svg").write_text(app.export_screenshot(title="phaseid"), "utf-8")


if __name__ == "__main__":
    asyncio.run(main())
