"""What a report says, as plain data that every format lays out in its own way."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

from phaseid.report.terminal import letter, percent

CAUTION = (
    "Grey level alone does not identify a phase. This list says which phases the image allows and how "
    "likely each is under the stated assumptions; confirm by X-ray or diffraction before a decision "
    "that matters. Where health, safety or the release of a part depends on the answer, local codes "
    "and licensed practice decide, not this report."
)


@dataclass(frozen=True)
class Table:
    """A table: heading cells and rows of cells, all text."""

    heading: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]


@dataclass(frozen=True)
class Section:
    """A heading with paragraphs, an optional table, and an optional picture (PNG)."""

    title: str
    paragraphs: tuple[str, ...] = ()
    table: Table | None = None
    picture: bytes | None = None


@dataclass(frozen=True)
class Report:
    """A report: title, sections, sources to cite."""

    title: str
    sections: tuple[Section, ...]
    sources: tuple[str, ...] = field(default=())


def build(
    document: Mapping[str, Any],
    picture: bytes | None,
    sources: Sequence[str],
    more: Sequence[Section] = (),
) -> Report:
    """Compose the report of one candidates document.

    Parameters
    ----------
    document : mapping
        As from `phaseid.report.document.document`.
    picture : bytes or None
        The figure as PNG.
    sources : sequence of str
        Publications behind the models used.
    more : sequence of Section
        Sections of plugins.

    Returns
    -------
    Report
    """
    sections = [
        Section("In short", _summary(document)),
        Section("Image and conditions", _conditions(document), picture=picture),
    ]
    if document["warnings"]:
        lines = [f"{w['message']} {w['remedy']}".strip() for w in document["warnings"]]
        sections.append(Section("What limits the image", tuple(lines)))
    sections += [_cluster(c) for c in document["clusters"]]
    if document["advice"]:
        rows = tuple(
            (f"{a['expected_bits']:.2f}", str(a["cluster"]), a["measure"])
            for a in document["advice"][:8]
        )
        table = Table(("Expected bits", "Cluster", "Measurement"), rows)
        sections.append(Section("What to measure next", (), table))
    hazards = _hazards(document)
    if hazards:
        sections.append(Section("Caution", hazards))
    sections += more
    sections.append(Section("How the list was made", _method(document)))
    name = document["image"]["path"].replace("\\", "/").rsplit("/", 1)[-1]
    return Report(f"Candidate phases: {name}", tuple(sections), tuple(sources))


def _summary(document: Mapping[str, Any]) -> tuple[str, ...]:
    lines = []
    for cluster in document["clusters"]:
        if cluster["left_out"]:
            continue
        if cluster["known"]:
            lines.append(f"{_title(cluster)}: given as {cluster['known']}.")
            continue
        best = cluster["candidates"][:3]
        leaders = ", ".join(f"{c['phase']} ({percent(c['probability'])})" for c in best)
        note = f"; accepted as {cluster['accepted']}" if cluster["accepted"] else ""
        lines.append(
            f"{_title(cluster)}: {leaders}; none of these {percent(cluster['none_of_these'])}{note}."
        )
    return (*lines, CAUTION)


def _title(cluster: Mapping[str, Any]) -> str:
    name = f" ({cluster['name']})" if cluster["name"] else ""
    return (
        f"Cluster {cluster['id']}{name}, grey {cluster['grey_mean']:.1f}, "
        f"{cluster['area_fraction']:.2%} of the area"
    )


def _conditions(document: Mapping[str, Any]) -> tuple[str, ...]:
    image, conditions = document["image"], document["conditions"]
    rows, columns = image["shape"]
    pixel = f", {image['pixel_size_nm']:.4g} nm per pixel" if image["pixel_size_nm"] else ""
    coat = conditions["coat"]
    coated = f", coat {coat['thickness_nm']:g} nm {coat['material']}" if coat else ", no coat"
    lines = [
        f"{image['path']}: {columns} x {rows} pixels, {image['bits']} bit{pixel}; SHA-256 {image['sha256']}.",
        f"Beam energy {conditions['energy_keV']:g} keV, tilt {conditions['tilt_deg']:g} degrees{coated}; "
        f"{conditions['detector']['kind']} detector, threshold "
        f"{conditions['detector']['threshold_keV']:g} keV.",
    ]
    if document["context"]:
        lines.append(f"Context: {', '.join(document['context'])}.")
    scale = document["scale"]
    if scale:
        held = (
            "; ".join(scale["references"]) or "no known phase: the scale, and the list, are broad"
        )
        lines.append(
            f"Grey = {scale['offset']:.2f} (± {scale['offset_se']:.2f}) + {scale['gain']:.1f} "
            f"(± {scale['gain_se']:.1f}) x signal; held by {held}."
        )
    return tuple(lines)


def _cluster(cluster: Mapping[str, Any]) -> Section:
    if cluster["left_out"]:
        return Section(_title(cluster), ("Left out by the analyst.",))
    groups = [c["group"] for c in cluster["candidates"]]
    rows = tuple(
        (
            percent(c["probability"]),
            letter(c["group"]) if groups.count(c["group"]) > 1 else "",
            c["phase"] + (" (!)" if c["hazard"] else ""),
            c["formula"],
            "" if c["mean_atomic_number"] is None else f"{c['mean_atomic_number']:.2f}",
            "" if c["eta"] is None else f"{c['eta']:.3f}",
            ""
            if c["predicted_grey"] is None
            else f"{c['predicted_grey']:.1f} ± {c['predicted_grey_sd']:.1f}",
        )
        for c in cluster["candidates"]
    )
    none = (percent(cluster["none_of_these"]), "", "none of these", "", "", "", "")
    heading = ("Probability", "Alike", "Phase", "Formula", "Mean Z", "eta", "Predicted grey")
    paragraphs = [*cluster["remarks"]]
    if cluster["seen"] or cluster["unseen"]:
        seen = [*cluster["seen"], *(f"no {s}" for s in cluster["unseen"])]
        paragraphs.append(f"X-ray spectrum: {', '.join(seen)}.")
    if cluster["resolution"] is not None and any(groups.count(g) > 1 for g in groups):
        paragraphs.append(
            "Phases with the same letter differ by less than the "
            f"{cluster['resolution']:.2g} grey levels this cluster can resolve; their order means nothing."
        )
    paragraphs += [f"{c['phase']}: {c['note']}" for c in cluster["candidates"] if c["note"]]
    return Section(_title(cluster), tuple(paragraphs), Table(heading, (*rows, none)))


def _hazards(document: Mapping[str, Any]) -> tuple[str, ...]:
    found: dict[str, list[str]] = {}
    for cluster in document["clusters"]:
        for candidate in cluster["candidates"]:
            if candidate["hazard"]:
                names = found.setdefault(candidate["hazard"], [])
                if candidate["phase"] not in names:
                    names.append(candidate["phase"])
    return tuple(f"{', '.join(names)}: {text}" for text, names in found.items())


def _method(document: Mapping[str, Any]) -> tuple[str, ...]:
    conditions = document["conditions"]
    return (
        "Greys were grouped with a Gaussian mixture. The detector signal of every phase of the "
        f"databases was predicted from its formula (eta: {conditions['model']}; compounds: "
        f"{conditions['rule']}). Grey was taken as offset plus gain times signal, plus a smooth "
        "departure as large as published eta formulas differ, plus each phase's own error as large as "
        "the compound rules differ; offset and gain were inferred from all evidence together, and every "
        "probability is averaged over what they can be.",
        "Candidates that share a letter cannot be told apart by grey. 'None of these' is the "
        "probability that the cluster is nothing in the databases.",
    )
