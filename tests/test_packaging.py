"""The built wheel holds exactly what it should."""

from __future__ import annotations

import subprocess
import sys
import zipfile

import pytest

from .conftest import ROOT

PACKAGES = {"phaseid", "phaseid_plugins", "phaseid_databases"}


@pytest.fixture(scope="module")
def wheel(tmp_path_factory):
    out = tmp_path_factory.mktemp("wheel")
    subprocess.run(
        [sys.executable, "-m", "build", "--wheel", "--no-isolation", "--outdir", out, ROOT],
        check=True,
        capture_output=True,
    )
    (built,) = out.glob("*.whl")
    with zipfile.ZipFile(built) as archive:
        return {n: archive.read(n) for n in archive.namelist()}


def test_exactly_the_three_packages(wheel):
    top = {name.split("/")[0] for name in wheel if ".dist-info/" not in name}
    assert top == PACKAGES


def test_every_source_and_data_file_is_in_it(wheel):
    for package, folder in (
        ("phaseid", ROOT / "phaseid"),
        ("phaseid_plugins", ROOT / "plugins/phaseid_plugins"),
        ("phaseid_databases", ROOT / "databases/phaseid_databases"),
    ):
        expected = {
            f"{package}/{p.relative_to(folder).as_posix()}"
            for p in folder.rglob("*")
            if p.is_file() and "__pycache__" not in p.parts
        }
        missing = expected - set(wheel)
        assert not missing
        assert f"{package}/py.typed" in wheel


def test_licence_and_entry_point(wheel):
    assert any(n.endswith("/licenses/LICENSE") for n in wheel)
    entry = next(text for n, text in wheel.items() if n.endswith("entry_points.txt"))
    assert b"phaseid = phaseid.cli:main" in entry


def test_no_file_of_another_kind(wheel):
    ours = [n for n in wheel if ".dist-info/" not in n]
    kinds = {n.rsplit(".", 1)[-1] for n in ours}
    assert kinds <= {"py", "typed", "yaml", "html", "tcss", "json", "npz", "csv"}
