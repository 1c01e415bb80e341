"""A real run in a real terminal: start, select, know, rank, export, quit; and a kill without warning."""

from __future__ import annotations

import json
import os
import shutil
import subprocess
import sys
import time
import uuid

import pytest

from ..conftest import ROOT
from ..session.conftest import scene, scene_greys  # noqa: F401

pytestmark = pytest.mark.skipif(shutil.which("tmux") is None, reason="tmux is not installed")
PATIENCE = 120.0


class Terminal:
    """A program in a terminal of its own server, so that nothing of the user's is touched."""

    def __init__(self, folder, command, size=(110, 36)):
        # One for each server: the last one may still be going.
        self.socket = str(folder / f"tmux-{uuid.uuid4().hex[:8]}.sock")
        home = {
            **os.environ,
            "HOME": str(folder),
            "TERM": "xterm-256color",
            "PYTHONPATH": os.pathsep.join(str(ROOT / p) for p in ("", "plugins", "databases")),
        }
        subprocess.run(
            ["tmux", "-S", self.socket, "-f", "/dev/null", "new-session", "-d", "-s", "t",
             "-x", str(size[0]), "-y", str(size[1]), f"{command}; echo DONE-$?; sleep 60"],
            check=True, env=home, cwd=folder,
        )  # fmt: skip

    def tmux(self, *arguments):
        return subprocess.run(
            ["tmux", "-S", self.socket, *arguments], capture_output=True, text=True, check=False
        ).stdout

    def screen(self):
        return self.tmux("capture-pane", "-t", "t", "-p")

    def press(self, *keys):
        for key in keys:
            self.tmux("send-keys", "-t", "t", key)
            time.sleep(0.15)

    def type(self, text):
        self.tmux("send-keys", "-t", "t", "-l", text)
        time.sleep(0.3)

    def wait(self, *words):
        end = time.monotonic() + PATIENCE
        while time.monotonic() < end:
            shown = self.screen()
            if all(w in shown for w in words):
                return shown
            time.sleep(0.3)
        raise AssertionError(f"{words} did not appear:\n{self.screen()}")

    def pid(self):
        return int(self.tmux("display-message", "-p", "-t", "t", "#{pane_pid}"))

    def end(self):
        self.tmux("kill-server")


@pytest.fixture
def terminal(tmp_path):
    opened = []

    def start(arguments, size=(110, 36)):
        command = f"{sys.executable} -c 'from phaseid.cli import main; main()' {arguments}"
        opened.append(Terminal(tmp_path, command, size))
        return opened[-1]

    yield start
    for one in opened:
        one.end()


def test_start_select_know_rank_export_quit_and_reopen_after_a_kill(terminal, scene, tmp_path):  # noqa: F811
    (tmp_path / "scene.tif").write_bytes(scene.read_bytes())
    run = terminal("triage scene.tif --energy 20 --context sedimentary")
    shown = run.wait("Five lines to begin with")
    assert "k says which phase" in shown
    run.press("Escape")
    shown = run.wait("20 keV", "scale not held", "prob.", "known phase", "●", "[")
    assert shown.count("●") >= 3  # candidates on the grey axis
    run.press("Up", "Up", "Up", "k")
    run.wait("Which phase is cluster 1")
    run.type("quartz")
    run.press("Enter")
    run.wait("= Quartz", "scale held by 1")
    run.press("p")
    run.wait("Wrote", "candidates.json")
    made = json.loads((tmp_path / "scene-candidates/candidates.json").read_text(encoding="utf-8"))
    assert made["clusters"][0]["known"] == "Quartz"
    # Killed without warning: what was said is on disk.
    child = subprocess.run(
        ["pgrep", "-P", str(run.pid())], capture_output=True, text=True, check=False
    ).stdout.split()
    for pid in child or [str(run.pid())]:
        os.kill(int(pid), 9)
    run.end()
    again = terminal("triage scene.phaseid.json", size=(80, 24))
    again.wait("= Quartz", "scale held by 1")
    again.press("u")
    again.wait("scale not held")
    again.press("q")
    again.wait("DONE-0")


def test_missing_file_in_a_terminal(terminal):
    run = terminal("triage no-such.tif")
    shown = run.wait("DONE-2")
    assert "no-such.tif is no file" in shown
    assert "Traceback" not in shown
