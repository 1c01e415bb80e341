"""Style, types, import contracts, and what must not be in the repository."""

from __future__ import annotations

import ast
import re
import shlex
import subprocess
import sys
import tomllib
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
    path_of_somebody = re.compile(
        r"/home/\w+/|/root/|/Users/\w+/|C:\\\\Users|" + re.escape(str(ROOT)) + r"\b"
    )
    read = (".py", ".md", ".yaml", ".toml", ".json", ".html", ".tcss", ".txt", "")
    found = [
        path.name
        for path in files()
        if path.suffix in read
        and path.name != Path(__file__).name
        and path.exists()
        and path_of_somebody.search(path.read_text("utf-8"))
    ]
    assert not found


# Names under which distributions are imported, where these differ.
IMPORTED_AS = {
    "scikit-learn": "sklearn",
    "scikit-image": "skimage",
    "pillow": "PIL",
    "pyyaml": "yaml",
    "python-docx": "docx",
}
# Compared with where they happen to be installed.
MAY_BE_ABSENT = {"numba"}


def imports(folder):
    """Top-level names of other people's packages that files of a folder import."""
    found = set()
    for path in (ROOT / folder).rglob("*.py"):
        for node in ast.walk(ast.parse(path.read_text("utf-8"))):
            if isinstance(node, ast.Import):
                found |= {alias.name.split(".")[0] for alias in node.names}
            elif isinstance(node, ast.ImportFrom) and node.module and not node.level:
                found.add(node.module.split(".")[0])
    ours = {"phaseid", "phaseid_plugins", "phaseid_databases", "tests"}
    return found - ours - set(sys.stdlib_module_names)


def declared(project, *extras):
    wanted = list(project["dependencies"])
    for extra in extras:
        wanted += project["optional-dependencies"][extra]
    names = {re.split(r"[<>=!~ \[;]", text)[0] for text in wanted}
    return {IMPORTED_AS.get(name, name.replace("-", "_")) for name in names}


def test_every_import_is_declared():
    project = tomllib.loads((ROOT / "pyproject.toml").read_text("utf-8"))["project"]
    packages = imports("phaseid") | imports("plugins") | imports("databases")
    assert packages <= declared(project, "spreadsheet", "docx")
    assert imports("tests") - MAY_BE_ABSENT <= declared(project, "test", "spreadsheet", "docx")
    assert imports("examples") <= declared(project)
    unused = declared(project) - packages
    # Read compressed TIFF for tifffile.
    assert unused <= {"imagecodecs"}


def test_readme_commands_are_what_ci_runs():
    readme = (ROOT / "README.md").read_text("utf-8")
    second = re.search(r"<!-- second command -->\s*```sh\n(.+?)\n```", readme, re.DOTALL)
    assert second is not None
    assert "pytest" in second[1]
    assert "second command" in (ROOT / ".ci/run").read_text("utf-8")


def test_first_command_of_the_readme_does_the_main_job(tmp_path):
    readme = (ROOT / "README.md").read_text("utf-8")
    first = re.search(r"<!-- first command -->\s*```sh\n(.+?)\n```", readme, re.DOTALL)
    assert first is not None
    steps = [step.strip() for step in first[1].split("&&")]
    assert steps[:2] == ["python3 -m venv .venv", ".venv/bin/pip install -q ."]
    name, *arguments = shlex.split(steps[2])
    assert name == ".venv/bin/phaseid"
    arguments[arguments.index("--out") + 1] = str(tmp_path)
    done = subprocess.run(
        [Path(sys.executable).parent / "phaseid", *arguments],
        cwd=ROOT,
        capture_output=True,
        text=True,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    assert {"candidates.json", "candidates.csv", "labels.tif"} <= {
        p.name for p in tmp_path.iterdir()
    }
