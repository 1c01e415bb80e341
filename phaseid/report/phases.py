"""Tables of phases for a terminal."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from rich.console import Group, RenderableType
from rich.table import Table
from rich.text import Text

if TYPE_CHECKING:
    from phaseid.phases.importing import Preview


def phases_table(document: Mapping[str, Any]) -> Group:
    """Table of a listing document."""
    table = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0))
    for heading, right in (
        ("phase", False),
        ("formula", False),
        ("mean Z", True),
        ("range", True),
        ("eta", True),
        ("density", True),
        ("database", False),
    ):
        table.add_column(heading, justify="right" if right else "left", overflow="fold")
    for phase in document["phases"]:
        low, high = phase["mean_atomic_number_min"], phase["mean_atomic_number_max"]
        table.add_row(
            Text(phase["name"] + (" (!)" if phase["hazard"] else "")),
            Text(phase["formula"]),
            f"{phase['mean_atomic_number']:.2f}",
            f"{low:.1f}-{high:.1f}" if high - low > 0.05 else "",
            f"{phase['eta']:.3f}",
            "" if phase["density"] is None else f"{phase['density']:.2f}",
            phase["database"],
        )
    parts: list[RenderableType] = [table, Text(f"{len(document['phases'])} phases")]
    if any(p["hazard"] for p in document["phases"]):
        parts.append(Text("(!) carries a caution; 'phaseid database show PHASE' tells it"))
    return Group(*parts)


def phase_sheet(phase: Mapping[str, Any]) -> Group:
    """Everything known of one phase."""
    lines: list[RenderableType] = [Text(phase["name"], style="bold")]
    for key, value in phase.items():
        if key == "name" or value in (None, [], {}):
            continue
        if isinstance(value, Mapping):
            value = ", ".join(f"{k}: {v}" for k, v in value.items())
        elif isinstance(value, list):
            value = ", ".join(str(v) for v in value)
        lines.append(Text(f"  {key.replace('_', ' '):<24} {value}"))
    return Group(*lines)


def preview_table(preview: Preview) -> Group:
    """What an import would do."""
    table = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0))
    for heading in ("phase", "formula", "density", "contexts"):
        table.add_column(heading, overflow="fold")
    for phase in preview.phases:
        table.add_row(
            Text(phase.name),
            Text(phase.formula),
            "" if phase.density is None else f"{phase.density:g}",
            ", ".join(f"{c}: {w}" for c, w in phase.contexts.items()),
        )
    parts: list[RenderableType] = [table, Text(f"{len(preview.phases)} rows are clean")]
    parts += [Text(f"refused: row {r.row} {r.name}: {r.reason}") for r in preview.refused]
    parts += [Text(f"takes the place of the shipped {name}") for name in preview.replaces]
    return Group(*parts)
