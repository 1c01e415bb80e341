"""Database files that were found clean before are not checked again: their records are kept on disk."""

from __future__ import annotations

import hashlib
import json
from dataclasses import asdict, replace
from pathlib import Path

from phaseid.errors import InputError
from phaseid.files import write_text
from phaseid.phases.database import Database, load
from phaseid.phases.records import Phase
from phaseid.phases.stored import cache_folder, key_of

_MOST = 60


def load_kept(path: Path | str) -> Database:
    """As `phaseid.phases.database.load`, from the cache where the file has not changed.

    Raises
    ------
    InputError
        As for `load`; a faulty file is never kept.
    """
    path = Path(path)
    try:
        digest = hashlib.sha256(path.read_bytes()).hexdigest()
    except OSError:
        return load(path)
    key = key_of(digest)
    store = cache_folder() / f"database-{key}.json"
    kept = _read(store, path)
    if kept is not None:
        return kept
    made = load(path)
    try:
        write_text(store, json.dumps(_plain(made), ensure_ascii=False))
        for old in sorted(store.parent.glob("database-*.json"), key=_age)[:-_MOST]:
            old.unlink(missing_ok=True)
    except (InputError, OSError):
        pass
    return made


def _age(path: Path) -> float:
    try:
        return path.stat().st_mtime
    except OSError:
        return 0.0


def _plain(database: Database) -> dict[str, object]:
    phases = [asdict(replace(p, location=p.location.rsplit(":", 1)[-1])) for p in database.phases]
    return {"name": database.name, "title": database.title, "phases": phases}


def _read(store: Path, path: Path) -> Database | None:
    """What was kept, or None where it is missing or broken."""
    try:
        data = json.loads(store.read_text(encoding="utf-8"))
        phases = tuple(
            Phase(
                **{
                    **entry,
                    "other_names": tuple(entry["other_names"]),
                    "ranges": {k: (v[0], v[1]) for k, v in entry["ranges"].items()},
                    "density_range": entry["density_range"] and tuple(entry["density_range"]),
                    "location": f"{path}:{entry['location']}",
                }
            )
            for entry in data["phases"]
        )
        return Database(data["name"], data["title"], str(path), phases)
    except (OSError, ValueError, KeyError, TypeError, IndexError, AttributeError):
        return None
