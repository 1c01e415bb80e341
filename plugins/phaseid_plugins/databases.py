"""The databases that ship."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from phaseid.hooks import hookimpl


def shipped_databases() -> list[Path]:
    """Paths of all database files of the package `phaseid_databases`."""
    import phaseid_databases

    return sorted(Path(phaseid_databases.__file__).parent.glob("*.yaml"))


@hookimpl
def register_databases() -> Sequence[Path]:
    return shipped_databases()
