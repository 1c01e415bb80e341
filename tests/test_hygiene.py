"""Style, types, import contracts, and what must not be in the repository."""

from __future__ import annotations

import re
import subprocess
import sys
from pathlib import Path

import pytest

from .conftest import ROOT

# Long modules hold two things.
MOST_LINES = 450


def tool(*arguments):
    return subprocess.run(
        [sys.executable, "-m", *arguments], cwd=ROOT, capture_output=True, text=True, check=False
    )


def test_ruff():
    done = tool("ruff", "check", ".")
    assert done.returncode == 0, done.stdout[-3000:]


def test_ruff_format():
    done = tool("ruff", "format", "--check", ".")
    assert done.returncode == 0, done.stdout[-3000:]


def test_mypy_strict():
    done = tool("mypy")
    assert done.returncode == 0, done.stdout[-3000:]


def test_import_contracts():
    script = Path(sys.executable).parent / "lint-imports"
    done = subprocess.run([script], cwd=ROOT, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stdout[-3000:]


def files():
    listed = subprocess.run(
        ["git", "ls-files", "-z"], cwd=ROOT, capture_output=True, text=True, check=False
    )
    if listed.returncode != 0:
        pytest.skip("not a git checkout")
    return [ROOT / name for name in listed.stdout.split("\0") if name]


def test_modules_are_short():
    long = {
        p.name: n
        for p in files()
        if p.suffix == ".py"
        and p.exists()
        and (n := len(p.read_text("utf-8").splitlines())) > MOST_LINES
    }
    assert not long


def test_no_path_of_a_machine():
    found = []
    for path in files():
        if (
            path.suffix in (".py", ".md", ".yaml", ".toml", ".json", ".html", ".tcss")
            and path.exists()
        ):
            text = path.read_text("utf-8")
            if re.search(r"/home/\w+/|/root/|C:\\\\Users", text) and path.name != "test_hygiene.py":
                found.append(path.name)
    assert not found


def test_readme_commands_are_what_ci_runs():
    readme = (ROOT / "README.md").read_text("utf-8")
    second = re.search(r"<!-- second command -->\s*```sh\n(.+?)\n```", readme, re.DOTALL)
    assert second is not None
    assert "pytest" in second[1]
    assert "second command" in (ROOT / ".ci/run").read_text("utf-8")
