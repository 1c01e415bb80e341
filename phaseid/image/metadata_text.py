"""Flattening of metadata: nested dictionaries, INI texts, `$KEY value` lists and XML."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import Any

Pair = tuple[str, Any, str]

# A text longer than this is no list of settings.
LONGEST_TEXT = 1 << 20
SIDECAR_SUFFIXES = (".txt", ".hdr", ".ini")


def flatten(metadata: Mapping[str, Any]) -> list[Pair]:
    """List every value with its name (parts separated by slashes) and its unit where given.

    Parameters
    ----------
    metadata : mapping
        Nested as the reader returns it.

    Returns
    -------
    list of (name, value, unit)
    """
    pairs: list[Pair] = []
    _walk("", metadata, pairs)
    return pairs


def sidecar(image: Path) -> list[Pair]:
    """Settings of a text file of the same name beside the image."""
    for suffix in SIDECAR_SUFFIXES:
        for path in (image.with_suffix(suffix), Path(f"{image}{suffix}")):
            if path == image or not path.is_file() or path.stat().st_size > LONGEST_TEXT:
                continue
            raw = path.read_bytes()
            utf16 = raw[:2] in (b"\xff\xfe", b"\xfe\xff")
            text = raw.decode("utf-16" if utf16 else "utf-8", "replace")
            pairs = parse_text(text)
            if pairs:
                return [(f"{path.name}/{n}", v, u) for n, v, u in pairs]
    return []


def _walk(prefix: str, value: Any, pairs: list[Pair]) -> None:
    if isinstance(value, Mapping):
        if "value" in value and "unit" in value and not isinstance(value["value"], Mapping):
            pairs.append((prefix, value["value"], str(value["unit"])))
            return
        for key, inner in value.items():
            _walk(f"{prefix}/{key}" if prefix else str(key), inner, pairs)
    elif isinstance(value, str):
        inner_pairs = parse_text(value) if ("\n" in value or "\r" in value or "<" in value) else []
        if inner_pairs:
            pairs.extend((f"{prefix}/{n}", v, u) for n, v, u in inner_pairs)
        else:
            pairs.append((prefix, value, ""))
    elif isinstance(value, tuple | list):
        _walk_sequence(prefix, value, pairs)
    else:
        pairs.append((prefix, value, ""))


def _walk_sequence(prefix: str, value: tuple[Any, ...] | list[Any], pairs: list[Pair]) -> None:
    labelled = len(value) in (2, 3) and isinstance(value[0], str)
    if labelled and not isinstance(value[1], str | tuple | list | Mapping):
        # (label, value[, unit]): the label tells more than the key.
        unit = value[2] if len(value) == 3 and isinstance(value[2], str) else ""
        pairs.append((prefix, value[1], unit))
        pairs.append((f"{prefix}/{value[0]}", value[1], unit))
    elif labelled and isinstance(value[1], str):
        pairs.append((prefix, value[1], ""))
        pairs.append((f"{prefix}/{value[0]}", value[1], ""))
    else:
        pairs.append((prefix, tuple(value), ""))


def parse_text(text: str) -> list[Pair]:
    """Read a text of settings in any of the usual forms.

    Parameters
    ----------
    text : str
        INI sections with `key = value` or `key: value`, lines `$KEY value`, or XML.

    Returns
    -------
    list of (name, value, unit)
        Empty if it is none of them.
    """
    if len(text) > LONGEST_TEXT:
        return []
    if text.lstrip().startswith("<"):
        return list(_xml(text))
    return list(_lines(text.replace("\x00", "").splitlines()))


def _lines(lines: Iterable[str]) -> Iterable[Pair]:
    section = ""
    for line in lines:
        line = line.strip()
        header = re.fullmatch(r"\[(.+)\]", line)
        if header:
            section = header.group(1) + "/"
            continue
        matched = re.match(r"\$(\S+)\s+(.+)", line) or re.match(
            r"([^=:]{1,60}?)\s*[=:]\s*(.+)", line
        )
        if matched:
            yield f"{section}{matched.group(1).strip()}", matched.group(2).strip(), ""


def _xml(text: str) -> Iterable[Pair]:
    """Leaves of an XML text by pattern: no parser, hence no entities to expand."""
    for matched in re.finditer(r"<([A-Za-z][\w:.-]*)((?:\s[^<>]*)?)>([^<>]{1,200})</\1\s*>", text):
        unit = re.search(r"\bunit\s*=\s*[\"']([^\"']*)[\"']", matched.group(2), re.I)
        yield matched.group(1), matched.group(3).strip(), unit.group(1) if unit else ""
    for matched in re.finditer(r"\b([A-Za-z][\w:.-]*)\s*=\s*\"([^\"<>]{1,200})\"", text):
        unit = re.search(rf"\b{re.escape(matched.group(1))}Unit\s*=\s*\"([^\"]*)\"", text)
        yield matched.group(1), matched.group(2), unit.group(1) if unit else ""
