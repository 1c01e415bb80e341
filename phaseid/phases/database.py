"""Database files: YAML of schema `phaseid-database/1` to records, with every fault named.

Format: see DEVELOPERS.md, "How to add a database".
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path

from phaseid.errors import InputError
from phaseid.phases.records import ABUNDANCE, CRYSTAL_SYSTEMS, Phase
from phaseid.phases.yaml_nodes import Fields, Items, Node, Scalar, read_yaml

SCHEMA = "phaseid-database/1"
_TOP = ("schema", "name", "title", "licence", "phases")
_PHASE = (
    "name",
    "other_names",
    "formula",
    "ranges",
    "density",
    "crystal_system",
    "contexts",
    "note",
    "hazard",
    "source",
)
_REQUIRED = ("name", "formula", "contexts", "source")
_DENSITY = (0.01, 30.0)


@dataclass(frozen=True)
class Database:
    """A database file that was read."""

    name: str
    title: str
    path: str
    phases: tuple[Phase, ...]


class DatabaseError(InputError):
    """A database file with faults.

    Attributes
    ----------
    faults : tuple of str
        One sentence each: file, line, field, remedy.
    """

    def __init__(self, faults: Sequence[str]) -> None:
        self.faults = tuple(faults)
        more = f" ({len(faults) - 1} more faults in this file.)" if len(faults) > 1 else ""
        super().__init__(faults[0] + more)


def load(path: Path | str) -> Database:
    """Read a database file.

    Parameters
    ----------
    path : Path or str

    Returns
    -------
    Database

    Raises
    ------
    DatabaseError
        If an entry is faulty; all faults are collected.
    InputError
        If the file cannot be read at all.
    """
    path = Path(path)
    return _File(path).read()


def load_many(paths: Iterable[Path | str]) -> list[Database]:
    """Read several database files.

    Raises
    ------
    InputError
        As for `load`.
    """
    return [load(p) for p in paths]


class _File:
    """Collects the faults of one file while reading it."""

    def __init__(self, path: Path) -> None:
        self.path = path
        self.faults: list[str] = []

    def fault(self, line: int, what: str, remedy: str) -> None:
        self.faults.append(f"{self.path}, line {line}: {what}; {remedy}.")

    def read(self) -> Database:
        root = read_yaml(self.path)
        if not isinstance(root, Fields):
            raise InputError(
                f"{self.path} does not start with named fields; begin with 'schema: {SCHEMA}'."
            )
        schema = root.fields.get("schema")
        if not isinstance(schema, Scalar) or schema.text != SCHEMA:
            found = (
                f"has the schema {schema.text!r}" if isinstance(schema, Scalar) else "has no schema"
            )
            raise InputError(f"{self.path} {found}; this version reads 'schema: {SCHEMA}'.")
        self._unknown(root, _TOP)
        name = self._text(root, "name") or self.path.stem
        title = self._text(root, "title") or name
        entries = root.fields.get("phases")
        phases: list[Phase] = []
        if not isinstance(entries, Items):
            self.fault(
                root.line, "there is no list 'phases'", "add 'phases:' with one entry per phase"
            )
        else:
            phases = [p for node in entries.items if (p := self._phase(node, name)) is not None]
        self._repeated(phases)
        if self.faults:
            raise DatabaseError(self.faults)
        return Database(name, title, str(self.path), tuple(phases))

    def _unknown(self, node: Fields, known: Sequence[str]) -> None:
        for field_name in node.fields:
            if field_name not in known:
                self.fault(
                    node.lines[field_name],
                    f"there is no field {field_name!r}",
                    f"use one of {', '.join(known)}",
                )

    def _phase(self, node: Node, database: str) -> Phase | None:
        if not isinstance(node, Fields):
            self.fault(node.line, "a phase needs named fields", "write '- name: ...'")
            return None
        before = len(self.faults)
        self._unknown(node, _PHASE)
        for field_name in _REQUIRED:
            if field_name not in node.fields:
                self.fault(node.line, f"the field {field_name!r} is missing", "add it")
        if len(self.faults) > before:
            return None
        phase = Phase(
            name=self._text(node, "name") or "",
            formula=self._text(node, "formula") or "",
            source=self._text(node, "source") or "",
            other_names=tuple(self._texts(node, "other_names")),
            ranges=self._ranges(node),
            density_range=self._density(node),
            crystal_system=self._choice(node, "crystal_system", CRYSTAL_SYSTEMS),
            contexts=self._contexts(node),
            note=self._text(node, "note"),
            hazard=self._text(node, "hazard"),
            database=database,
            location=f"{self.path}:{node.line}",
        )
        if len(self.faults) == before:
            try:
                _ = phase.parsed
            except InputError as error:
                message = str(error).rstrip(".")
                self.faults.append(
                    f"{self.path}, line {node.lines['formula']}, field 'formula': {message}."
                )
        return phase

    def _text(self, node: Fields, name: str) -> str | None:
        found = node.fields.get(name)
        if found is None:
            return None
        if not isinstance(found, Scalar):
            self.fault(node.lines[name], f"{name!r} must be text", "write it on one line")
            return None
        if not found.text.strip():
            self.fault(node.lines[name], f"{name!r} is empty", "fill it in or remove the field")
            return None
        return " ".join(found.text.split())

    def _texts(self, node: Fields, name: str) -> list[str]:
        found = node.fields.get(name)
        if found is None:
            return []
        if not isinstance(found, Items) or not all(isinstance(i, Scalar) for i in found.items):
            self.fault(
                node.lines[name], f"{name!r} must be a list of texts", "write [first, second]"
            )
            return []
        return [i.text.strip() for i in found.items if isinstance(i, Scalar)]

    def _number(self, node: Node, name: str) -> float | None:
        try:
            if isinstance(node, Scalar):
                value = float(node.text)
                if abs(value) < 1e9:
                    return value
        except ValueError:
            pass
        self.fault(node.line, f"{name!r} must be a number", "write for example 3.27")
        return None

    def _pair(self, node: Node, name: str) -> tuple[float, float] | None:
        if not isinstance(node, Items) or len(node.items) != 2:
            self.fault(node.line, f"{name!r} must be two numbers", "write [lower, upper]")
            return None
        low, high = (self._number(i, name) for i in node.items)
        if low is None or high is None:
            return None
        if low > high:
            self.fault(
                node.line, f"{name!r} runs from {low:g} to {high:g}", "give the lower end first"
            )
            return None
        return low, high

    def _ranges(self, node: Fields) -> dict[str, tuple[float, float]]:
        found = node.fields.get("ranges")
        if found is None:
            return {}
        if not isinstance(found, Fields):
            self.fault(found.line, "'ranges' must name variables", "write {x: [0, 1]}")
            return {}
        pairs = {name: self._pair(value, f"ranges: {name}") for name, value in found.fields.items()}
        return {name: pair for name, pair in pairs.items() if pair is not None}

    def _density(self, node: Fields) -> tuple[float, float] | None:
        found = node.fields.get("density")
        if found is None:
            return None
        if isinstance(found, Items):
            pair = self._pair(found, "density")
        else:
            number = self._number(found, "density")
            pair = None if number is None else (number, number)
        if pair is not None and not _DENSITY[0] <= pair[0] <= pair[1] <= _DENSITY[1]:
            self.fault(found.line, "'density' is no density of a solid", "give it in g/cm3")
            return None
        return pair

    def _choice(self, node: Fields, name: str, allowed: Sequence[str]) -> str | None:
        text = self._text(node, name)
        if text is not None and text not in allowed:
            self.fault(
                node.lines[name], f"{name!r} is {text!r}", f"use one of {', '.join(allowed)}"
            )
        return text

    def _contexts(self, node: Fields) -> dict[str, str]:
        found = node.fields.get("contexts")
        if not isinstance(found, Fields) or not found.fields:
            line = node.lines.get("contexts", node.line)
            self.fault(line, "'contexts' must name contexts", "write {steel: common}")
            return {}
        contexts: dict[str, str] = {}
        for path, value in found.fields.items():
            word = value.text if isinstance(value, Scalar) else ""
            if word not in ABUNDANCE:
                self.fault(
                    found.lines[path],
                    f"the abundance in {path!r} is {word!r}",
                    f"use one of {', '.join(ABUNDANCE)}",
                )
                continue
            contexts[path] = word
        return contexts

    def _repeated(self, phases: Sequence[Phase]) -> None:
        seen: dict[str, Phase] = {}
        for phase in phases:
            key = phase.name.casefold()
            if key in seen:
                line = phase.location.rsplit(":", 1)[-1]
                first = seen[key].location.rsplit(":", 1)[-1]
                self.fault(
                    int(line),
                    f"{phase.name!r} stands twice (first in line {first})",
                    "rename or remove one",
                )
            seen[key] = phase
