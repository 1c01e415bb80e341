"""Readable tables for a terminal."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from rich.console import Console, Group, RenderableType
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

BAR = 10


def candidates_tables(document: Mapping[str, Any]) -> Group:
    """Tables of one candidates document: warnings, the grey scale, every cluster, the advice."""
    parts: list[RenderableType] = [_heading(document)]
    parts += [_warning(w) for w in document["warnings"]]
    for cluster in document["clusters"]:
        parts += [Text(), _cluster_line(cluster)]
        if cluster["candidates"]:
            parts += [Padding(_cluster_table(cluster), (0, 0, 0, 2))]
            parts += [Padding(t, (0, 0, 0, 2)) for t in _remarks(cluster)]
    parts += _advice(document)
    parts += _hazards(document)
    return Group(*parts)


def show(console: Console, documents: Sequence[Mapping[str, Any]]) -> None:
    """Print the tables of several documents."""
    for n, document in enumerate(documents):
        if n:
            console.rule()
        console.print(candidates_tables(document))


def _heading(document: Mapping[str, Any]) -> Text:
    image, conditions = document["image"], document["conditions"]
    text = Text(image["path"], style="bold")
    rows, columns = image["shape"]
    size = f"  {columns} x {rows} pixels, {image['bits']} bit"
    if image["pixel_size_nm"]:
        size += f", {image['pixel_size_nm']:.4g} nm per pixel"
    text.append(size, style="default")
    text.append(f"\n{conditions['energy_keV']:g} keV")
    if conditions["tilt_deg"]:
        text.append(f", tilt {conditions['tilt_deg']:g} degrees")
    if conditions["coat"]:
        text.append(f", {conditions['coat']['thickness_nm']:g} nm {conditions['coat']['material']}")
    text.append(f", {conditions['detector']['kind']} detector")
    if document["context"]:
        text.append(f"; context: {', '.join(document['context'])}")
    scale = document["scale"]
    if scale:
        text.append(f"\nGrey = {_pm(scale['offset'], scale['offset_se'])} + ")
        text.append(f"({_pm(scale['gain'], scale['gain_se'])}) x signal")
        held = "; ".join(scale["references"])
        text.append(f"; held by {held}" if held else "; held by no known phase, so broad")
    return text


def _pm(value: float, error: float) -> str:
    digits = 1 if error >= 0.95 else 2
    return f"{value:.{digits}f} ± {error:.{digits}f}"


def _warning(warning: Mapping[str, str]) -> Text:
    text = Text("warning ", style="bold yellow")
    text.append(f"[{warning['code']}] {warning['message']} {warning.get('remedy', '')}".rstrip())
    return text


def _cluster_line(cluster: Mapping[str, Any]) -> Text:
    text = Text(f"Cluster {cluster['id']}", style="bold")
    if cluster["name"]:
        text.append(f" ({cluster['name']})", style="bold")
    bound = {"low": "at or below ", "high": "at or above "}.get(cluster["clipped"] or "", "")
    text.append(f"  grey {bound}{cluster['grey_mean']:.1f}")
    if not bound:
        text.append(f" ± {cluster['grey_se']:.2g}")
    text.append(f"  {cluster['area_fraction']:.2%} of the area in {cluster['regions']} regions")
    if cluster["left_out"]:
        text.append("  left out")
    if cluster["known"]:
        text.append(f"  known: {cluster['known']}", style="bold")
    if cluster["seen"] or cluster["unseen"]:
        seen = [*cluster["seen"], *(f"no {s}" for s in cluster["unseen"])]
        text.append(f"  X-ray: {', '.join(seen)}")
    return text


def _cluster_table(cluster: Mapping[str, Any]) -> Table:
    table = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0))
    table.add_column("probability", justify="right", no_wrap=True)
    table.add_column("", no_wrap=True)
    table.add_column("alike", no_wrap=True)
    table.add_column("phase", overflow="fold", ratio=3)
    table.add_column("formula", overflow="fold", ratio=3)
    table.add_column("mean Z", justify="right", no_wrap=True)
    table.add_column("eta", justify="right", no_wrap=True)
    table.add_column("predicted grey", justify="right", no_wrap=True)
    groups = [c["group"] for c in cluster["candidates"]]
    for candidate in cluster["candidates"]:
        name = candidate["phase"] + (" (!)" if candidate["hazard"] else "")
        mark = letter(candidate["group"]) if groups.count(candidate["group"]) > 1 else ""
        table.add_row(
            percent(candidate["probability"]),
            bar(candidate["probability"]),
            mark,
            Text(name),
            Text(candidate["formula"]),
            _plain(candidate["mean_atomic_number"], 2),
            _plain(candidate["eta"], 3),
            _grey(candidate),
        )
    table.add_row(
        percent(cluster["none_of_these"]), bar(cluster["none_of_these"]), "", "none of these"
    )
    return table


def percent(probability: float | None) -> str:
    """A probability as a person reads it."""
    if probability is None:
        return ""
    if 0 < probability < 0.001:
        return "< 0.1 %"
    return f"{100 * probability:.1f} %"


def bar(probability: float | None, width: int = BAR) -> str:
    """A bar that also reads without colour."""
    filled = round((probability or 0.0) * width)
    return "█" * filled + "·" * (width - filled)


def letter(group: int) -> str:
    """Name of a group of candidates that grey cannot tell apart."""
    return "abcdefghijklmnopqrstuvwxyz"[(group - 1) % 26]


def _plain(value: float | None, digits: int) -> str:
    return "" if value is None else f"{value:.{digits}f}"


def _grey(candidate: Mapping[str, Any]) -> str:
    if candidate["predicted_grey"] is None:
        return ""
    return f"{candidate['predicted_grey']:.1f} ± {candidate['predicted_grey_sd']:.1f}"


def _remarks(cluster: Mapping[str, Any]) -> list[Text]:
    found = [Text(remark, style="italic") for remark in cluster["remarks"]]
    groups: dict[int, list[str]] = {}
    for candidate in cluster["candidates"]:
        groups.setdefault(candidate["group"], []).append(candidate["phase"])
    for group, names in groups.items():
        if len(names) > 1 and not cluster["known"]:
            found.append(
                Text(
                    f"{letter(group)}: {', '.join(names)} differ by less than the "
                    f"{cluster['resolution']:.2g} grey levels this cluster can resolve.",
                    style="italic",
                )
            )
    return found


def _advice(document: Mapping[str, Any]) -> list[RenderableType]:
    if not document["advice"]:
        return []
    parts: list[RenderableType] = [Text(), Text("What to measure next", style="bold")]
    for advice in document["advice"][:5]:
        parts.append(Text(f"  {advice['expected_bits']:.2f} bits  {advice['measure']}"))
    return parts


def _hazards(document: Mapping[str, Any]) -> list[RenderableType]:
    hazards = {
        candidate["phase"]: candidate["hazard"]
        for cluster in document["clusters"]
        for candidate in cluster["candidates"]
        if candidate["hazard"]
    }
    if not hazards:
        return []
    parts: list[RenderableType] = [Text(), Text("Caution (!)", style="bold")]
    by_text: dict[str, list[str]] = {}
    for phase, hazard in hazards.items():
        by_text.setdefault(hazard, []).append(phase)
    parts += [Text(f"  {', '.join(names)}: {text}") for text, names in by_text.items()]
    return parts


def prediction_table(document: Mapping[str, Any]) -> Group:
    """Table of a prediction document."""
    conditions = document["conditions"]
    heading = Text(
        f"{conditions['energy_keV']:g} keV, tilt {conditions['tilt_deg']:g} degrees, "
        f"{document['model']}, {conditions['rule']}"
    )
    table = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0))
    table.add_column("phase", overflow="fold")
    table.add_column("formula", overflow="fold")
    headings = ("mean Z", "eta", "signal", "mean energy keV", "range um", "depth um")
    for text in headings:
        table.add_column(text, justify="right", no_wrap=True)
    for phase in document["phases"]:
        table.add_row(
            Text(phase["name"] + (" (!)" if phase["hazard"] else "")),
            Text(phase["formula"]),
            _plain(phase["mean_atomic_number"], 2),
            f"{phase['eta']:.4f} ± {phase['eta_sd']:.4f}",
            _plain(phase["signal"], 4),
            _plain(phase["mean_energy_keV"], 2),
            _plain(phase["range_um"], 2),
            _plain(phase["information_depth_um"], 2),
        )
    parts: list[RenderableType] = [heading, table]
    for phase in document["phases"]:
        for name, value in phase.get("eta_by_model", {}).items():
            parts.append(Text(f"{phase['name']}: eta {value:.4f} by {name}"))
    parts += [_warning(w) for w in document["warnings"]]
    parts += [Text(f"(!) {p['name']}: {p['hazard']}") for p in document["phases"] if p["hazard"]]
    return Group(*parts)
