"""The one screen: picture, clusters, grey axis, candidates, and what was said last."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any, ClassVar

from textual import work
from textual.app import ComposeResult
from textual.binding import Binding
from textual.containers import Horizontal
from textual.message import Message
from textual.screen import Screen
from textual.widgets import DataTable, Footer, Static

from phaseid.errors import InputError
from phaseid.ui.actions import Action
from phaseid.ui.arranging import Arranging
from phaseid.ui.asking import Asking
from phaseid.ui.widgets import CandidateList, ClusterList, GreyAxis, Picture
from phaseid.ui.work import Answer, Plan, answer, needs_energy, open_work

if TYPE_CHECKING:
    from phaseid.session.answers import Candidate, ClusterAnswer
    from phaseid.session.state import State
    from phaseid.session.work import Session


class Progressed(Message):
    """How far long work is; only the last one counts."""

    def __init__(self, share: float, word: str) -> None:
        super().__init__()
        self.share, self.word = share, word

    def can_replace(self, message: Message) -> bool:
        return isinstance(message, Progressed)


class Came(Message):
    """Something a thread worked out, with the number of the run it belongs to."""

    def __init__(self, run: int, value: Any) -> None:
        super().__init__()
        self.run, self.value = run, value


class Bench(Asking, Arranging, Screen[None]):
    """Shows the present answer; every action goes through the session and comes back as a new answer."""

    CSS_PATH = "bench.tcss"
    AUTO_FOCUS: ClassVar[str | None] = "#clusters"

    def __init__(self, plan: Plan, actions: tuple[Action, ...], first_time: bool) -> None:
        super().__init__()
        self.plan, self.actions, self.first_time = plan, actions, first_time
        self.session: Session | None = None
        self.answered: Answer | None = None
        self.index = 0
        self.selected: int | None = None
        self.candidate: int | None = None
        self.corner: tuple[int, int] | None = None
        self.run = 0
        self.busy = False
        for one in actions:
            self._bindings.key_to_bindings.setdefault(one.key, []).append(
                Binding(
                    one.key, one.name, one.label, show=one.footer, id=one.name, tooltip=one.help
                )
            )

    def compose(self) -> ComposeResult:
        yield Static("phaseid", id="title", markup=False)
        with Horizontal(id="upper"):
            yield Picture(id="picture")
            yield ClusterList(id="clusters")
        yield GreyAxis(id="axis")
        yield CandidateList(id="candidates")
        yield Static("Opening…", id="said", markup=False)
        yield Footer(id="footer", compact=True, show_command_palette=False)

    def on_mount(self) -> None:
        self._start(lambda progress: open_work(self.plan, progress))

    # --- threads: one at a time counts; what comes late is dropped ---

    def _start(self, job: Callable[[Callable[[float, str], None]], Any]) -> None:
        self.run += 1
        self.busy = True
        self._thread(self.run, job)

    @work(thread=True, group="aside", exit_on_error=False)
    def aside(self, job: Callable[[], Any], then: Callable[[Any], None]) -> None:
        """Work something out beside the answers and hand it, or what went wrong, over."""
        try:
            value = job()
        except InputError as error:
            self.app.call_from_thread(self.say, str(error))
            return
        self.app.call_from_thread(then, value)

    @work(thread=True, exclusive=True, group="answers", exit_on_error=False)
    def _thread(self, run: int, job: Callable[[Callable[[float, str], None]], Any]) -> None:
        def progress(share: float, word: str) -> None:
            if run != self.run:
                # Newer work has begun; stop this one at its next step.
                raise InputError("Superseded.")
            self.post_message(Progressed(share, word))

        try:
            value = job(progress)
        except InputError as error:
            value = error
        self.post_message(Came(run, value))

    def on_progressed(self, message: Progressed) -> None:
        if self.busy:
            self.say(f"{message.share:4.0%}  {message.word}")

    def on_came(self, message: Came) -> None:
        if message.run != self.run:
            return
        self.busy = False
        if isinstance(message.value, InputError):
            self._failed(message.value)
        elif isinstance(message.value, Answer):
            self._show(message.value)
        elif message.value is not None:
            self.session = message.value.session
            self.opened_message = message.value.message
            self.rank()

    def _failed(self, error: InputError) -> None:
        if self.session is None:
            self.app.exit(return_code=2, message=f"phaseid: {error}")
            return
        if needs_energy(error):
            self.ask_energy()
            return
        # What cannot be answered is taken back at once, on disk as well.
        label = self.session.undo() if self.unanswered else None
        self.unanswered = max(0, self.unanswered - 1)
        self.say(f"{error}" + (f" Taken back: {label}." if label else ""))
        if label:
            self.rank(quiet=True)

    def action_stop(self) -> None:
        if self.session is None:
            # There is nothing to show yet, and nothing was said that could be lost.
            self.action_quit()
        elif self.busy:
            self.run += 1
            self.busy = False
            back = [self.session.undo() for _ in range(self.unanswered)]
            self.unanswered = 0
            told = f" Taken back: {'; '.join(filter(None, back))}." if back else ""
            self.say(f"Stopped.{told} The same key begins again.")
            self.stopped = True
        elif self.stopped:
            self.rank()

    # Actions taken since the last answer; what cannot be answered is taken back.
    unanswered = 0
    stopped = False
    opened_message = ""

    def take(self, label: str, state: State) -> None:
        """Take up a new state and answer it."""
        if self.session is None or state == self.session.state:
            return
        try:
            self.session.apply(label, state)
        except InputError as error:
            self.say(str(error))
            return
        self.unanswered += 1
        self.done = label
        self.rank()

    done = ""

    def rank(self, quiet: bool = False) -> None:
        """Answer the present state."""
        session, index = self.session, self.index
        if session is None:
            return
        self.keep_said, self.stopped = quiet, False
        state = session.state
        self._start(lambda progress: answer(session, state, index, progress))

    keep_said = False

    # --- showing ---

    def _show(self, answered: Answer) -> None:
        self.unanswered = 0
        self.answered = answered
        clusters = self.clusters
        ids = [c.id for c in clusters]
        if self.selected not in ids:
            open_ones = [c for c in clusters if not c.known and c.observation is not None]
            chosen = max(open_ones or clusters, key=lambda c: c.area_fraction, default=None)
            self.selected = chosen.id if chosen else None
        self._title()
        self.query_one(ClusterList).show(clusters, self.selected)
        self.refresh_selected()
        if not self.keep_said:
            self.say(self._summary())
        self.done = ""
        if self.first_time:
            self.first_time = False
            self.action_help(first=True)

    def refresh_selected(self) -> None:
        """Show the selected cluster everywhere."""
        if self.answered is None:
            return
        self.query_one(Picture).show(self.answered, self.selected)
        self.query_one(GreyAxis).show(self.answered, self.selected)
        self.query_one(CandidateList).show(self.cluster, self.candidate)

    def _title(self) -> None:
        assert self.answered is not None
        assert self.session is not None
        analysis, image = self.answered.analysis, self.answered.image
        parts = [Path(image.path).name]
        if len(self.session.state.images) > 1:
            parts[0] += f" ({self.index + 1} of {len(self.session.state.images)})"
            parts.append("same settings" if self.session.state.same_settings else "separate scales")
        parts.append(f"{analysis.conditions.energy_keV:g} keV")
        if analysis.conditions.coat is not None:
            parts.append(str(analysis.conditions.coat))
        parts.append(", ".join(analysis.contexts) or "no context")
        scale = analysis.scale
        held = len(scale.references) if scale else 0
        parts.append(f"scale held by {held}" if held else "scale not held")
        warned = len(self.answered.notices) + len(analysis.notices)
        if warned:
            parts.append(f"{warned} notices (F2)")
        self.query_one("#title", Static).update(" | ".join(parts))

    def _summary(self) -> str:
        assert self.answered is not None
        said = f"{self.done}.  " if self.done else f"{self.opened_message}  "
        self.opened_message = ""
        advice = self.answered.analysis.advice
        if advice:
            said += f"Next ({advice[0].bits:.1f} bits): {advice[0].text}"
        return said.strip()

    def say(self, text: str) -> None:
        """Say one thing at the bottom of the screen."""
        self.query_one("#said", Static).update(text)

    # --- what is selected ---

    @property
    def clusters(self) -> tuple[ClusterAnswer, ...]:
        """Clusters of the image that is shown."""
        return () if self.answered is None else self.answered.analysis.of_image(self.index)

    @property
    def cluster(self) -> ClusterAnswer | None:
        """The selected cluster."""
        return next((c for c in self.clusters if c.id == self.selected), None)

    @property
    def chosen(self) -> Candidate | None:
        """The selected candidate of the selected cluster."""
        cluster = self.cluster
        if cluster is None or not cluster.candidates:
            return None
        row = self.query_one(CandidateList).cursor_row
        return cluster.candidates[row] if row < len(cluster.candidates) else None

    def on_data_table_row_highlighted(self, event: DataTable.RowHighlighted) -> None:
        if event.row_key is None or event.row_key.value is None:
            return
        if event.data_table.id == "clusters":
            if event.data_table.has_focus and int(event.row_key.value) != self.selected:
                self.select(int(event.row_key.value))
        elif event.data_table.has_focus:
            self._say_candidate()

    def select(self, cluster: int) -> None:
        """Select a cluster."""
        self.selected, self.candidate = cluster, None
        self.refresh_selected()

    def _say_candidate(self) -> None:
        chosen = self.chosen
        if chosen is None:
            return
        self.candidate = chosen.phase
        told = [t for t in (chosen.hazard and f"(!) {chosen.hazard}", chosen.note) if t]
        self.say("  ".join(told) or f"{chosen.name}: {chosen.formula}, from {chosen.database}.")

    def on_picture_touched(self, message: Picture.Touched) -> None:
        from phaseid.report.picture import read_point

        if self.answered is None:
            return
        point = read_point(
            self.answered.image, self.answered.clustering, message.row, message.column
        )
        words = [f"row {point.row}, column {point.column}: grey {point.grey:g}"]
        if point.cluster is not None:
            words.append(f"cluster {point.cluster}")
        if point.region_pixels is not None:
            words.append(f"region of {point.region_pixels} pixels")
        if point.region_um is not None:
            words.append(f"{point.region_um:.3g} um wide")
        self.say(", ".join(words))

    def on_grey_axis_touched(self, message: GreyAxis.Touched) -> None:
        self.candidate = message.phase
        if message.cluster != self.selected:
            self.selected = message.cluster
            self.query_one(ClusterList).show(self.clusters, self.selected)
        self.refresh_selected()

    def with_state(self, **changes: Any) -> State:
        """The present state with other fields."""
        assert self.session is not None
        return replace(self.session.state, **changes)
