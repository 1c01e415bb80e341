"""The grey axis in characters: clusters above it where they were measured, candidates below it where they
are predicted. Everything also reads without colour."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from phaseid.report.terminal import letter, percent
from phaseid.session.answers import Candidate, ClusterAnswer

BLOCKS = " ▁▂▃▄▅▆▇█"
# Room on the right for names of candidates, and on the left for nothing: the axis starts at the edge.
NAME_WIDTH = 30


@dataclass(frozen=True)
class Line:
    """One line of the axis: its text, and which cluster and candidate it stands for, if any."""

    text: str
    cluster: int | None = None
    phase: int | None = None
    kind: str = "plain"


@dataclass(frozen=True)
class Span:
    """Greys that the axis runs over."""

    low: float
    high: float
    width: int

    def column(self, grey: float) -> int:
        """Column of a grey, cut at the ends."""
        share = (grey - self.low) / (self.high - self.low)
        return int(np.clip(round(share * (self.width - 1)), 0, self.width - 1))


def span_of(clusters: Sequence[ClusterAnswer], width: int) -> Span:
    """An axis over all measured greys with a margin."""
    greys = [c.grey_mean for c in clusters] or [0.0, 255.0]
    low, high = min(greys), max(greys)
    margin = 0.15 * (high - low) or 10.0
    return Span(low - margin, high + margin, max(width, 20))


def axis_lines(
    clusters: Sequence[ClusterAnswer],
    selected: int | None,
    histogram: tuple[NDArray[np.float64], NDArray[np.float64]] | None,
    width: int,
    height: int,
) -> list[Line]:
    """Lay the grey axis out.

    Parameters
    ----------
    clusters : sequence of ClusterAnswer
        Of one image, ascending grey.
    selected : int or None
        Id of the selected cluster; its candidates come first.
    histogram : tuple of ndarray or None
        Greys and counts.
    width, height : int
        Columns and lines to fill.

    Returns
    -------
    list of Line
    """
    names = min(NAME_WIDTH, max(12, width // 3))
    span = span_of(clusters, width - names)
    lines = [*_histogram(span, histogram, 2 if height < 14 else 4)]
    lines.append(_marks(span, clusters, selected))
    lines.append(_scale(span))
    room = height - len(lines)
    for cluster, candidate in _shown(clusters, selected, room):
        lines.append(_candidate(span, cluster, candidate, names))
    return lines[:height]


def _histogram(
    span: Span, histogram: tuple[NDArray[np.float64], NDArray[np.float64]] | None, rows: int
) -> list[Line]:
    if histogram is None:
        return []
    values, counts = histogram
    edges = np.linspace(span.low, span.high, span.width + 1)
    column = np.sqrt(np.histogram(values, bins=edges, weights=counts)[0])
    level = np.round(column / max(column.max(), 1e-9) * 8 * rows).astype(int)
    lines = []
    for row in range(rows - 1, -1, -1):
        filled = np.clip(level - 8 * row, 0, 8)
        # A trace of a rare phase must not vanish by rounding.
        if row == 0:
            filled = np.where((column > 0) & (filled == 0), 1, filled)
        lines.append(Line("".join(BLOCKS[f] for f in filled), kind="histogram"))
    return lines


def _marks(span: Span, clusters: Sequence[ClusterAnswer], selected: int | None) -> Line:
    """Cluster numbers at their greys, with their width; the selected one in brackets."""
    cells = [" "] * span.width
    for cluster in clusters:
        low = span.column(cluster.grey_mean - cluster.grey_sd)
        high = span.column(cluster.grey_mean + cluster.grey_sd)
        for column in range(low, high + 1):
            cells[column] = "─" if cells[column] == " " else "═"
    for cluster in clusters:
        text = f"[{cluster.id}]" if cluster.id == selected else str(cluster.id)
        text = {"low": "≤" + text, "high": "≥" + text}.get(cluster.clipped or "", text)
        start = span.column(cluster.grey_mean) - len(text) // 2
        for n, character in enumerate(text):
            if 0 <= start + n < span.width:
                cells[start + n] = character
    return Line("".join(cells), kind="clusters")


def _scale(span: Span) -> Line:
    cells = ["┴" if n % 10 == 0 else "─" for n in range(span.width)]
    for n in range(0, span.width - 4, 20):
        label = f"{span.low + (span.high - span.low) * n / (span.width - 1):.0f}"
        cells[n + 1 : n + 1 + len(label)] = label
    return Line("".join(cells)[: span.width], kind="scale")


def _shown(
    clusters: Sequence[ClusterAnswer], selected: int | None, room: int
) -> list[tuple[ClusterAnswer, Candidate]]:
    """Candidates of the selected cluster, then the leaders of the others, as many as there is room for."""
    chosen = [c for c in clusters if c.id == selected]
    others = [(c, c.candidates[0]) for c in clusters if c.id != selected and c.candidates]
    kept = max(room - len(others), room // 2)
    mine = [(c, candidate) for c in chosen for candidate in c.candidates][:kept]
    return [*mine, *others][:room]


def _candidate(span: Span, cluster: ClusterAnswer, candidate: Candidate, names: int) -> Line:
    """A candidate at its predicted grey with its error, and the cluster's grey as a thin upright."""
    cells = [" "] * span.width
    cells[span.column(cluster.grey_mean)] = "┊"
    grey, sd = candidate.predicted_grey, candidate.predicted_grey_sd
    if np.isfinite(grey):
        low, high = span.column(grey - sd), span.column(grey + sd)
        for column in range(low, high + 1):
            cells[column] = "┼" if cells[column] == "┊" else "╌"
        at = span.column(grey)
        outside = grey < span.low or grey > span.high
        cells[at] = ("◂" if grey < span.low else "▸") if outside else "●"
    label = f" {cluster.id} {percent(candidate.probability):>7} {candidate.name}"
    return Line(
        "".join(cells) + label[:names].ljust(names), cluster.id, candidate.phase, "candidate"
    )


def group_letters(cluster: ClusterAnswer) -> dict[int, str]:
    """Letter of each candidate that shares its group with another one shown."""
    groups = [c.group for c in cluster.candidates]
    return {c.phase: letter(c.group) for c in cluster.candidates if groups.count(c.group) > 1}
