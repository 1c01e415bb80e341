"""The session file: readable, versioned JSON, written after every action."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import phaseid
from phaseid.errors import InputError
from phaseid.files import write_text
from phaseid.session.state import SCHEMA, History, State, Step, from_json, to_json

# Older steps are dropped, so that the file stays small whatever the length of the work.
LONGEST_HISTORY = 200


def save(path: Path, state: State, history: History) -> None:
    """Write a session file in one step.

    Parameters
    ----------
    path : Path
    state : State
    history : History

    Raises
    ------
    InputError
        If the file cannot be written.
    """
    data = {
        "schema": SCHEMA,
        "phaseid": phaseid.__version__,
        "state": to_json(state),
        "past": [_step(s) for s in history.past[-LONGEST_HISTORY:]],
        "future": [_step(s) for s in history.future[:LONGEST_HISTORY]],
    }
    write_text(path, json.dumps(data, indent=1, ensure_ascii=False) + "\n")


def load(path: Path) -> tuple[State, History]:
    """Read a session file.

    Parameters
    ----------
    path : Path

    Returns
    -------
    state : State
    history : History

    Raises
    ------
    InputError
        If the file is missing, is no session, or was written by a newer version.
    """
    try:
        text = path.read_text(encoding="utf-8")
    except OSError as error:
        raise InputError(
            f"Cannot read the session {path}: {error.strerror or error}; check the path."
        ) from None
    except UnicodeDecodeError:
        raise InputError(
            f"{path} is not a session file; give one that phaseid has written."
        ) from None
    try:
        data = json.loads(text)
    except (json.JSONDecodeError, RecursionError) as error:
        where = f" (line {error.lineno})" if isinstance(error, json.JSONDecodeError) else ""
        raise InputError(f"{path} is not valid JSON{where}; restore it from a copy.") from None
    if not isinstance(data, dict) or not str(data.get("schema", "")).startswith("phaseid-session/"):
        raise InputError(f"{path} is not a session file; give one that phaseid has written.")
    if data["schema"] != SCHEMA:
        raise InputError(
            f"{path} has the schema {data['schema']}, this version reads {SCHEMA}; update phaseid."
        )
    state = from_json(data.get("state"), str(path))
    return state, History(_steps(data, "past", path), _steps(data, "future", path))


def looks_like_session(path: Path) -> bool:
    """Whether a file holds a session rather than an image."""
    try:
        with path.open("rb") as stream:
            start = stream.read(200)
    except OSError:
        return False
    return start.lstrip().startswith(b"{") and b"phaseid-session" in start


def _step(step: Step) -> dict[str, Any]:
    return {"label": step.label, "before": to_json(step.before)}


def _steps(data: dict[str, Any], name: str, path: Path) -> tuple[Step, ...]:
    found = data.get(name, [])
    if not isinstance(found, list):
        raise InputError(f"{path}: field {name!r} must be a list; restore the file from a copy.")
    steps = []
    for item in found:
        if not isinstance(item, dict):
            raise InputError(
                f"{path}: field {name!r} holds no steps; restore the file from a copy."
            )
        steps.append(Step(str(item.get("label", "")), from_json(item.get("before"), str(path))))
    return tuple(steps)
