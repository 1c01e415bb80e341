"""What all tests share: nothing of this user's configuration leaks in or out."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[1]


@pytest.fixture(autouse=True)
def _isolated(tmp_path_factory, monkeypatch):
    """Caches, plugins and accepted identifications in folders of the test run."""
    home = tmp_path_factory.getbasetemp() / "home"
    home.mkdir(exist_ok=True)
    monkeypatch.setenv("PHASEID_CACHE", str(home / "cache"))
    monkeypatch.setenv(
        "PHASEID_LEARNED", str(tmp_path_factory.mktemp("learned") / "learned.sqlite")
    )
    for name in ("XDG_CONFIG_HOME", "XDG_DATA_HOME", "XDG_CACHE_HOME"):
        monkeypatch.setenv(name, str(home / name))
    monkeypatch.delenv("PHASEID_PLUGINS", raising=False)
    monkeypatch.delenv("PHASEID_BLOCK", raising=False)


@pytest.fixture(scope="session")
def knowledge():
    """Everything that ships, without plugins of this user."""
    from phaseid.hooks.host import make_host
    from phaseid.session.knowledge import Knowledge
    from phaseid.session.learned import Learned

    host = make_host(entry_points=False, folders=[])
    return Knowledge.load(
        host=host, learned=Learned(Path(os.devnull).parent / "no-such-folder" / "x")
    )


@pytest.fixture(scope="session")
def small_knowledge():
    """Three mineral databases: enough for the session and the screen, and quick."""
    from phaseid.hooks.host import make_host
    from phaseid.phases.catalogue import merge
    from phaseid.phases.kept import load_kept
    from phaseid.session.knowledge import Knowledge

    host = make_host(entry_points=False, folders=[])
    names = ("silicates-framework", "carbonates-evaporites", "accessory-oxides")
    files = [p for p in host.databases() if p.stem in names]
    return Knowledge(host, merge([load_kept(p) for p in files]))


@pytest.fixture(scope="session")
def shared_folder():
    """Real images and published values beside the checkout; skipped where they are not there."""
    told = os.environ.get("PHASEID_SHARED")
    folder = Path(told) if told else ROOT.parent / "shared"
    if not folder.is_dir():
        pytest.skip("the real images are not there")
    return folder
