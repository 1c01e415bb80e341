"""YAML as text with line numbers: nothing is guessed, nothing is executed, nothing is expanded."""

from __future__ import annotations

import re
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from phaseid.errors import InputError

LARGEST_BYTES = 8_000_000


# Where an anchor, alias or tag could begin; inside words and arithmetic none can.
_EXPANDING = re.compile(r"(?<![\w)\]}])[&*!]")


@dataclass(frozen=True)
class Scalar:
    """A scalar as it was written, and its line (from 1)."""

    text: str
    line: int


@dataclass(frozen=True)
class Items:
    """A list."""

    items: tuple[Scalar | Items | Fields, ...]
    line: int


@dataclass(frozen=True)
class Fields:
    """Named fields in order."""

    fields: dict[str, Scalar | Items | Fields]
    line: int
    lines: dict[str, int]


Node = Scalar | Items | Fields


def read_yaml(path: Path) -> Node:
    """Read a YAML file.

    Parameters
    ----------
    path : Path

    Returns
    -------
    Node

    Raises
    ------
    InputError
        If the file cannot be read, is no YAML, is too large, repeats a field, or uses anchors, aliases
        or tags: a file of phases needs none, and they can blow up a small file without bound.
    """
    try:
        with path.open("rb") as stream:
            content = stream.read(LARGEST_BYTES + 1)
    except OSError as error:
        raise InputError(
            f"Cannot read the database {path}: {error.strerror or error}; check the path."
        ) from None
    if len(content) > LARGEST_BYTES:
        raise InputError(
            f"{path} is larger than {LARGEST_BYTES // 1_000_000} MB; split it into several databases."
        )
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError:
        raise InputError(f"{path} is not UTF-8 text; save it as UTF-8.") from None
    return _parsed(text, path)


def _parsed(text: str, path: Path) -> Node:
    import yaml

    fast = getattr(yaml, "CSafeLoader", yaml.SafeLoader)
    # Scalars stay text, so nothing has to guess their types.
    loader = type("Text", (fast,), {"yaml_implicit_resolvers": {}})
    try:
        if _EXPANDING.search(text):
            _refuse_expansion(text, loader, path)
        node = yaml.compose(text, Loader=loader)
    except yaml.YAMLError as error:
        mark = getattr(error, "problem_mark", None)
        line = f", line {mark.line + 1}" if mark is not None else ""
        problem = getattr(error, "problem", None) or "not valid YAML"
        raise InputError(f"{path}{line}: {problem}; correct the YAML.") from None
    except RecursionError:
        raise InputError(
            f"{path} is nested too deeply; write it as a plain list of phases."
        ) from None
    if node is None:
        raise InputError(f"{path} is empty; see 'phaseid database check --help' for the format.")
    return _node(node, path)


def _refuse_expansion(text: str, loader: Any, path: Path) -> None:
    """Look at the events only: an alias is refused before anything it stands for is built."""
    import yaml

    for event in yaml.parse(text, Loader=loader):
        line = event.start_mark.line + 1 if event.start_mark else 1
        if isinstance(event, yaml.AliasEvent) or getattr(event, "anchor", None):
            raise InputError(
                f"{path}, line {line}: anchors and aliases (& and *) are not allowed; write the value "
                "out, or put it in quotes."
            )
        if getattr(event, "tag", None):
            raise InputError(f"{path}, line {line}: tags (!) are not allowed; remove it.")


def _node(node: Any, path: Path) -> Node:
    import yaml

    line = node.start_mark.line + 1
    if isinstance(node, yaml.ScalarNode):
        return Scalar(str(node.value), line)
    if isinstance(node, yaml.SequenceNode):
        return Items(tuple(_node(n, path) for n in node.value), line)
    fields: dict[str, Node] = {}
    lines: dict[str, int] = {}
    for key, value in node.value:
        at = key.start_mark.line + 1
        if not isinstance(key, yaml.ScalarNode):
            raise InputError(f"{path}, line {at}: a field's name must be plain text; correct it.")
        if key.value in fields:
            raise InputError(
                f"{path}, line {at}: the field {key.value!r} stands twice (first in line "
                f"{lines[key.value]}); remove one."
            )
        fields[key.value], lines[key.value] = _node(value, path), at
    return Fields(fields, line, lines)
