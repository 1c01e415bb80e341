"""The parts of the screen. They show what they are given and say what was touched.

What draws is imported where it draws: the frame stands before numpy and scipy are loaded.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from rich.text import Text
from textual import events
from textual.app import ComposeResult
from textual.containers import Container
from textual.message import Message
from textual.widgets import DataTable, Static
from textual_image.widget import Image

from phaseid.report.terminal import bar, percent

if TYPE_CHECKING:
    from phaseid.report.axis import Line
    from phaseid.report.picture import View
    from phaseid.session.answers import Candidate, ClusterAnswer
    from phaseid.ui.work import Answer

# Pixels drawn per character cell: enough for terminals that show real pixels.
CELL = (16, 8)
# Longest name in the list of candidates; the line below tells it in full.
NAME = 34


class Picture(Container, can_focus=True):
    """The image: a window of it, the selected cluster lit, a cursor."""

    class Touched(Message):
        """A pixel of the image was clicked."""

        def __init__(self, row: int, column: int) -> None:
            super().__init__()
            self.row, self.column = row, column

    def __init__(self, **more: Any) -> None:
        super().__init__(**more)
        self.answered: Answer | None = None
        self.view: View | None = None
        self.cursor: tuple[int, int] | None = None
        self.selected: int | None = None

    def compose(self) -> ComposeResult:
        yield Image(id="pixels")

    def show(self, answered: Answer, selected: int | None) -> None:
        from phaseid.report.picture import View

        if self.answered is None or self.answered.image.sha256 != answered.image.sha256:
            self.view = View.whole(answered.image.data.shape)
            self.cursor = None
        self.answered, self.selected = answered, selected
        self.draw()

    def draw(self) -> None:
        if (
            self.answered is None
            or self.view is None
            or not self.size.width
            or not self.size.height
        ):
            return
        from PIL import Image as Pixels

        from phaseid.report.picture import render

        size = (self.size.height * CELL[0], self.size.width * CELL[1])
        drawn = render(
            self.answered.image,
            self.answered.clustering,
            self.view,
            size,
            self.selected,
            self.cursor,
        )
        self.query_one("#pixels", Image).image = Pixels.fromarray(drawn)

    def on_resize(self) -> None:
        self.draw()

    def on_click(self, event: events.Click) -> None:
        if self.answered is None or self.view is None:
            return
        from phaseid.report.picture import point_at

        height, width = self.size.height, self.size.width
        aspect = width * CELL[1] / (height * CELL[0])
        found = point_at(
            self.view,
            self.answered.image.data.shape,
            aspect,
            (event.y + 0.5) / height,
            (event.x + 0.5) / width,
        )
        if found is not None:
            self.cursor = found
            self.draw()
            self.post_message(self.Touched(*found))

    def on_key(self, event: events.Key) -> None:
        steps = {"up": (-1, 0), "down": (1, 0), "left": (0, -1), "right": (0, 1)}
        if event.key not in steps or self.answered is None or self.view is None:
            return
        event.stop()
        shape = self.answered.image.data.shape
        step = max(1, round(max(shape) / self.view.zoom / 24))
        row, column = self.cursor or (int(self.view.row), int(self.view.column))
        down, right = steps[event.key]
        self.cursor = (
            min(max(row + down * step, 0), shape[0] - 1),
            min(max(column + right * step, 0), shape[1] - 1),
        )
        top, left, tall, wide = self.view.window(shape, 2.0)
        if not (top < self.cursor[0] < top + tall and left < self.cursor[1] < left + wide):
            self.view = self.view.moved(down * 0.5, right * 0.5, shape)
        self.draw()
        self.post_message(self.Touched(*self.cursor))

    def zoom(self, factor: float) -> None:
        from phaseid.report.picture import View

        if self.view is not None:
            if self.cursor is not None:
                self.view = View(float(self.cursor[0]), float(self.cursor[1]), self.view.zoom)
            self.view = self.view.zoomed(factor)
            if self.view.zoom == 1.0 and self.answered is not None:
                self.view = View.whole(self.answered.image.data.shape)
            self.draw()


class GreyAxis(Static, can_focus=False):
    """Clusters above the axis, candidates below it."""

    class Touched(Message):
        """A candidate's line was clicked."""

        def __init__(self, cluster: int, phase: int | None) -> None:
            super().__init__()
            self.cluster, self.phase = cluster, phase

    def __init__(self, **more: Any) -> None:
        super().__init__(**more)
        self.answered: Answer | None = None
        self.selected: int | None = None
        self.lines: Sequence[Line] = ()

    def show(self, answered: Answer, selected: int | None) -> None:
        self.answered, self.selected = answered, selected
        self.draw()

    def draw(self) -> None:
        if self.answered is None or self.size.width < 10:
            return
        from phaseid.report.axis import axis_lines

        clusters = self.answered.analysis.of_image(self.answered.index)
        values, counts = self.answered.clustering.histogram
        self.lines = axis_lines(
            clusters,
            self.selected,
            (values, counts.astype(float)),
            self.size.width,
            self.size.height,
        )
        styles = {"clusters": "bold", "histogram": "dim", "scale": "", "candidate": ""}
        text = Text(no_wrap=True)
        for line in self.lines:
            style = styles.get(line.kind, "")
            if line.kind == "candidate" and line.cluster != self.selected:
                style = "dim"
            text.append(line.text + "\n", style=style)
        self.update(text)

    def on_resize(self) -> None:
        self.draw()

    def on_click(self, event: events.Click) -> None:
        if 0 <= event.y < len(self.lines):
            line = self.lines[event.y]
            if line.cluster is not None:
                self.post_message(self.Touched(line.cluster, line.phase))


class ClusterList(DataTable[Any]):
    """One row per cluster."""

    def show(self, clusters: Sequence[ClusterAnswer], selected: int | None) -> None:
        if not self.columns:
            self.cursor_type = "row"
            self.add_columns("", "grey", "area", "what it is")
        self.clear()
        for cluster in clusters:
            self.add_row(
                str(cluster.id),
                Text(_grey(cluster), justify="right"),
                Text(f"{cluster.area_fraction:.1%}", justify="right"),
                Text(what(cluster)),
                key=str(cluster.id),
            )
        ids = [c.id for c in clusters]
        if selected in ids:
            self.move_cursor(row=ids.index(selected))


class CandidateList(DataTable[Any]):
    """One row per candidate of the selected cluster."""

    def show(self, cluster: ClusterAnswer | None, keep: int | None) -> None:
        if not self.columns:
            self.cursor_type = "row"
            self.add_columns("prob.", "", "=", "phase", "mean Z", "eta", "grey", "formula")
        self.clear()
        from phaseid.report.axis import group_letters

        if cluster is None or cluster.observation is None:
            return
        letters = group_letters(cluster)
        for candidate in cluster.candidates:
            self.add_row(*_cells(candidate, letters), key=str(candidate.phase))
        self.add_row(
            percent(cluster.none_of_these), bar(cluster.none_of_these, 6), "", "none of these",
            "", "", "", "", key="none",
        )  # fmt: skip
        phases = [c.phase for c in cluster.candidates]
        if keep in phases:
            self.move_cursor(row=phases.index(keep))


def _cells(candidate: Candidate, letters: dict[int, str]) -> list[Text | str]:
    name = candidate.name + (" (!)" if candidate.hazard else "")
    grey = candidate.predicted_grey
    return [
        Text(percent(candidate.probability), justify="right"),
        bar(candidate.probability, 6),
        letters.get(candidate.phase, ""),
        Text(name if len(name) <= NAME else name[: NAME - 1] + "…"),
        f"{candidate.mean_atomic_number:.2f}",
        f"{candidate.eta:.3f}",
        "" if grey != grey else f"{grey:.0f}±{candidate.predicted_grey_sd:.0f}",
        # Last, as it can be long; the table scrolls sideways.
        Text(candidate.formula),
    ]


def _grey(cluster: ClusterAnswer) -> str:
    sign = {"low": "≤", "high": "≥"}.get(cluster.clipped or "", "")
    return f"{sign}{cluster.grey_mean:.1f}"


def what(cluster: ClusterAnswer) -> str:
    """What is known of a cluster in a few words."""
    if cluster.observation is None:
        return "left out"
    told = f"{cluster.name}: " if cluster.name else ""
    if cluster.known:
        return f"{told}= {cluster.known}"
    if cluster.accepted:
        return f"{told}accepted {cluster.accepted}"
    if not cluster.candidates:
        return told + "?"
    best = cluster.candidates[0]
    return f"{told}{best.name}? {percent(best.probability)}"
