"""The actions of the bench: each asks what it needs, makes a new state, and hands it over."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from textual.screen import Screen

from phaseid.errors import InputError
from phaseid.ui.actions import HINT, Action
from phaseid.ui.dialogs import Ask, Pick, PickSeveral, Show
from phaseid.ui.widgets import ClusterList, Picture

if TYPE_CHECKING:
    from phaseid.session.answers import Candidate, ClusterAnswer
    from phaseid.session.state import State
    from phaseid.session.work import Session
    from phaseid.ui.work import Answer

    Base = Screen[None]
else:
    Base = object


class Asking(Base):
    """Mixed into the bench, which holds the session and shows the answers."""

    if TYPE_CHECKING:
        session: Session | None
        answered: Answer | None
        actions: tuple[Action, ...]
        index: int
        selected: int | None
        corner: tuple[int, int] | None

        @property
        def cluster(self) -> ClusterAnswer | None: ...
        @property
        def clusters(self) -> tuple[ClusterAnswer, ...]: ...
        @property
        def chosen(self) -> Candidate | None: ...
        def take(self, label: str, state: State) -> None: ...
        def with_state(self, **changes: Any) -> State: ...
        def say(self, text: str) -> None: ...
        def rank(self, quiet: bool = False) -> None: ...
        def select(self, cluster: int) -> None: ...
        def refresh_selected(self) -> None: ...

    # --- evidence ---

    def _mark(self, kind: Any, value: str = "", note: str = "", grey: float | None = None) -> None:
        session, cluster = self.session, self.cluster
        if session is None or (grey is None and cluster is None):
            return
        at = grey if grey is not None else round(cluster.grey_mean, 4)  # type: ignore[union-attr]
        where = f"grey {at:.4g}"
        label = f"{where}: {kind} {value}".strip()
        try:
            self.take(label, session.with_mark(kind, at, value, note, self.index))
        except InputError as error:
            self.say(str(error))

    def _search(self, text: str) -> Sequence[tuple[str, str]]:
        assert self.session is not None
        return self.session.knowledge.search(text)

    def action_know(self) -> None:
        cluster = self.cluster
        if cluster is None:
            return
        leaders = [(c.name, f"{c.name}  {c.formula}") for c in cluster.candidates]

        def search(text: str) -> Sequence[tuple[str, str]]:
            return self._search(text) if text.strip() else leaders

        title = f"Which phase is cluster {cluster.id} (grey {cluster.grey_mean:.1f})?"
        self.app.push_screen(
            Pick(title, "name, formula or part of a name", search),
            lambda phase: self._mark("known", phase) if phase else None,
        )

    def action_forget(self) -> None:
        session, cluster = self.session, self.cluster
        if session is None or cluster is None:
            return
        kept = tuple(m for m in session.state.marks if not self._is_about(m, cluster))
        if kept == session.state.marks:
            self.say(f"Nothing was said about cluster {cluster.id}.")
            return
        self.take(f"forgot what was said about cluster {cluster.id}", self.with_state(marks=kept))

    def _is_about(self, mark: Any, cluster: ClusterAnswer) -> bool:
        if mark.image != self.index or mark.kind in ("standard", "dark"):
            return False
        nearest = min(self.clusters, key=lambda c: abs(c.grey_mean - mark.grey))
        return nearest.id == cluster.id

    def _ask_elements(self, kind: str, title: str) -> None:
        if self.cluster is None:
            return
        self.app.push_screen(
            Ask(f"{title} of cluster {self.cluster.id}", "for example Fe, O"),
            lambda text: self._mark(kind, ",".join(_words(text))) if text else None,
        )

    def action_seen(self) -> None:
        self._ask_elements("seen", "Elements seen in the X-ray spectrum")

    def action_unseen(self) -> None:
        self._ask_elements("unseen", "Elements looked for and not found in the spectrum")

    def action_standard(self) -> None:
        self.app.push_screen(
            Ask("A standard imaged at the same settings", "GREY=FORMULA, for example 200=Cu"),
            self._standard,
        )

    def _standard(self, text: str | None) -> None:
        if not text:
            return
        grey, found, formula = text.partition("=")
        number = _number(grey)
        if not found or number is None or not formula.strip():
            self.say(f"{text!r} is not of the form GREY=FORMULA.")
            return
        self._mark("standard", formula.strip(), grey=number)

    def action_dark(self) -> None:
        self.app.push_screen(Ask("Grey with no beam", "for example 12"), self._dark)

    def _dark(self, text: str | None) -> None:
        if text:
            number = _number(text)
            if number is None:
                self.say(f"{text!r} is no grey.")
            else:
                self._mark("dark", grey=number)

    def action_context(self) -> None:
        if self.session is None:
            return
        entries = [
            (c.path, f"{'  ' * c.path.count('/')}{c.title}")
            for c in self.session.knowledge.contexts.all()
        ]
        self.app.push_screen(
            PickSeveral("What is the sample?", entries, self.session.state.contexts), self._contexts
        )

    def _contexts(self, chosen: list[str] | None) -> None:
        if chosen is not None:
            label = f"context {', '.join(chosen) or 'none'}"
            self.take(label, self.with_state(contexts=tuple(chosen)))

    # --- conditions ---

    def action_conditions(self) -> None:
        if self.session is None:
            return
        state = self.session.state
        now = [
            f"energy={state.energy_keV:g}" if state.energy_keV else "",
            f"tilt={state.tilt_deg:g}" if state.tilt_deg else "",
            f"coat={state.coat}" if state.coat else "",
            f"detector={state.detector}" if state.detector else "",
        ]
        self.app.push_screen(
            Ask(
                "Conditions: energy=KEV tilt=DEG coat=MATERIAL:NM detector=KIND:KEV",
                "energy=20 tilt=0 coat=C:15 detector=solid-state:2",
                " ".join(n for n in now if n),
            ),
            self._conditions,
        )

    def _conditions(self, text: str | None) -> None:
        if text is None:
            return
        told: dict[str, str] = {}
        for word in text.split():
            name, found, value = word.partition("=")
            if not found or name not in ("energy", "tilt", "coat", "detector"):
                self.say(f"{word!r} is not one of energy=, tilt=, coat=, detector=.")
                return
            told[name] = value
        numbers = {n: _number(told[n]) for n in ("energy", "tilt") if told.get(n)}
        if None in numbers.values():
            self.say("Energy and tilt are numbers.")
            return
        self.take(
            f"conditions {text or 'from the metadata'}",
            self.with_state(
                energy_keV=numbers.get("energy"),
                tilt_deg=numbers.get("tilt"),
                coat=told.get("coat") or None,
                detector=told.get("detector") or None,
            ),
        )

    def ask_energy(self) -> None:
        """Ask for the beam energy, which the metadata do not tell."""
        self.app.push_screen(
            Ask("The metadata do not tell the beam energy, in keV", "for example 20"), self._energy
        )

    def _energy(self, text: str | None) -> None:
        number = _number(text or "")
        if number is None:
            self.say("Nothing can be predicted without the beam energy; e sets it.")
            return
        self.take(f"beam energy {number:g} keV", self.with_state(energy_keV=number))

    def action_model(self) -> None:
        if self.session is None:
            return
        models = [(m.name, f"{m.name}  {m.source}") for m in self.session.knowledge.models()]

        def search(text: str) -> Sequence[tuple[str, str]]:
            return [m for m in models if text.casefold() in m[1].casefold()]

        self.app.push_screen(Pick("Formula for eta of the elements", "name", search), self._model)

    def _model(self, name: str | None) -> None:
        if not name or self.session is None:
            return
        from phaseid.ui.work import compare_models

        try:
            changed = compare_models(self.session, self.session.state, self.index, name)
        except InputError as error:
            self.say(str(error))
            return
        self.app.push_screen(Show(f"What {name} changes", changed))
        self.take(f"eta model {name}", self.with_state(model=name))

    # --- decisions ---

    def action_accept(self) -> None:
        chosen = self.chosen
        if chosen is not None:
            self.app.push_screen(
                Ask(f"Accept {chosen.name}; a note?", "may stay empty"),
                lambda note: self._accept(chosen, note),
            )

    def _accept(self, chosen: Candidate, note: str | None) -> None:
        if note is None or self.session is None or self.answered is None or self.cluster is None:
            return
        grey = self.cluster.grey_mean
        self._mark("accepted", chosen.name, note)
        self.session.remember(chosen.name, self.answered.image.sha256, grey, note)

    def action_reject(self) -> None:
        chosen = self.chosen
        if chosen is not None:
            self.app.push_screen(
                Ask(f"Reject {chosen.name}; the reason?", "may stay empty"),
                lambda why: self._mark("rejected", chosen.name, why) if why is not None else None,
            )

    def action_list(self) -> None:
        if self.cluster is not None:
            self.app.push_screen(
                Pick(
                    f"Add a phase to the list of cluster {self.cluster.id}",
                    "name, formula or part of a name",
                    self._search,
                ),
                lambda phase: self._mark("listed", phase) if phase else None,
            )

    def action_compare(self) -> None:
        chosen, cluster = self.chosen, self.cluster
        if chosen is None or cluster is None:
            return
        others = [
            (str(c.phase), f"{c.name}  {c.formula}")
            for c in cluster.candidates
            if c.phase != chosen.phase
        ]

        def search(text: str) -> Sequence[tuple[str, str]]:
            return [o for o in others if text.casefold() in o[1].casefold()]

        self.app.push_screen(
            Pick(f"Compare {chosen.name} with", "name", search),
            lambda other: self._compare(chosen.phase, other) if other else None,
        )

    def _compare(self, first: int, other: str) -> None:
        from phaseid.session.telling import tell_difference

        if self.answered is not None and self.cluster is not None and other.isdigit():
            text = tell_difference(self.answered.analysis, self.cluster, first, int(other))
            self.app.push_screen(Show("What speaks for which", text))

    def action_explain(self) -> None:
        from phaseid.session.telling import tell_why

        if self.answered is not None and self.cluster is not None and self.chosen is not None:
            text = tell_why(self.answered.analysis, self.cluster, self.chosen)
            self.app.push_screen(Show(f"Why {self.chosen.name}", text))

    # --- clusters ---

    def _edit(self, label: str, kind: Any, numbers: Sequence[float]) -> None:
        if self.session is not None:
            self.take(label, self.session.with_edit(kind, numbers, image=self.index))

    def _ask_cluster(self, title: str, then: Any) -> None:
        cluster = self.cluster
        if cluster is None:
            return
        others = [
            (str(c.id), f"cluster {c.id}  grey {c.grey_mean:.1f}  {c.area_fraction:.1%}")
            for c in self.clusters
            if c.id != cluster.id
        ]

        def search(text: str) -> Sequence[tuple[str, str]]:
            return [o for o in others if text in o[1]]

        def taken(value: str | None) -> None:
            other = next((c for c in self.clusters if str(c.id) == value), None)
            if other is not None:
                then(cluster, other)

        self.app.push_screen(Pick(title.format(cluster.id), "number", search), taken)

    def action_merge(self) -> None:
        self._ask_cluster(
            "Merge cluster {} with",
            lambda a, b: self._edit(
                f"merged clusters {a.id} and {b.id}", "merge", [a.grey_mean, b.grey_mean]
            ),
        )

    def action_split(self) -> None:
        cluster = self.cluster
        if cluster is not None:
            self.app.push_screen(
                Ask(f"Split cluster {cluster.id} into how many?", "2", "2"),
                lambda text: (
                    self._edit(
                        f"split cluster {cluster.id}", "split", [cluster.grey_mean, int(text)]
                    )
                    if text and text.isdigit()
                    else None
                ),
            )

    def action_boundary(self) -> None:
        def then(a: ClusterAnswer, b: ClusterAnswer) -> None:
            def moved(text: str | None) -> None:
                grey = _number(text or "")
                if grey is not None:
                    self._edit(
                        f"boundary of clusters {a.id} and {b.id} at {grey:g}",
                        "boundary",
                        [a.grey_mean, b.grey_mean, grey],
                    )

            middle = (a.grey_mean + b.grey_mean) / 2
            self.app.push_screen(Ask("Boundary at which grey?", f"{middle:.0f}"), moved)

        self._ask_cluster("Move the boundary between cluster {} and", then)

    def action_rename(self) -> None:
        if self.cluster is not None:
            self.app.push_screen(
                Ask(f"Name of cluster {self.cluster.id}", "for example rim", self.cluster.name),
                lambda name: self._mark("named", name) if name else None,
            )

    def action_leave_out(self) -> None:
        session, cluster = self.session, self.cluster
        if session is None or cluster is None:
            return
        if cluster.observation is None:
            kept = tuple(
                m
                for m in session.state.marks
                if not (m.kind == "ignored" and self._is_about(m, cluster))
            )
            self.take(f"cluster {cluster.id} taken in again", self.with_state(marks=kept))
        else:
            self._mark("ignored")

    def action_count(self) -> None:
        self.app.push_screen(Ask("How many clusters?", "empty lets the tool choose"), self._count)

    def _count(self, text: str | None) -> None:
        if text is None or self.session is None:
            return
        if text.isdigit() and 1 <= int(text) <= 60:
            self._edit(f"{text} clusters", "count", [int(text)])
        elif not text:
            kept = tuple(
                e
                for e in self.session.state.edits
                if not (e.kind == "count" and e.image == self.index)
            )
            self.take("number of clusters chosen by the tool", self.with_state(edits=kept))
        else:
            self.say("The number of clusters is a whole number from 1 to 60.")

    def action_area(self) -> None:
        at = self.query_one(Picture).cursor
        if at is None:
            self.say("Click in the picture, or move the cursor there with the arrows, first.")
        elif self.corner is None:
            self.corner = at
            self.say("One corner marked; go to the opposite corner and press the key again.")
        else:
            (r0, c0), (r1, c1) = self.corner, at
            self.corner = None
            numbers = [min(r0, r1), min(c0, c1), abs(r1 - r0) + 1, abs(c1 - c0) + 1]
            self._edit(f"excluded {numbers[2]} x {numbers[3]} pixels", "rectangle", numbers)

    # --- series, screen, files ---

    def action_same(self) -> None:
        if self.session is not None:
            now = not self.session.state.same_settings
            self.take(
                "one grey scale for all images" if now else "a grey scale for each image",
                self.with_state(same_settings=now),
            )

    def action_next_image(self) -> None:
        if self.session is not None and len(self.session.state.images) > 1:
            self.index = (self.index + 1) % len(self.session.state.images)
            self.selected = None
            self.rank()

    def action_site(self) -> None:
        if self.session is not None:
            now = not self.session.state.site_knowledge
            word = "counts" if now else "does not count"
            self.take(
                f"what this laboratory accepted before {word}", self.with_state(site_knowledge=now)
            )

    def action_find(self) -> None:
        picture = self.query_one(Picture)
        if picture.cursor is None or self.answered is None:
            self.say("Click in the picture, or move the cursor there with the arrows, first.")
            return
        label = int(self.answered.clustering.labels[picture.cursor])
        if label:
            self.select(label)
            self.query_one(ClusterList).show(self.clusters, label)
        else:
            self.say("There is no cluster at that point.")

    def action_zoom_in(self) -> None:
        self.query_one(Picture).zoom(1.6)

    def action_zoom_out(self) -> None:
        self.query_one(Picture).zoom(1 / 1.6)

    def action_notices(self) -> None:
        if self.answered is None:
            return
        found = [*self.answered.notices, *self.answered.analysis.notices]
        text = "\n\n".join(f"{n.message}\n-> {n.remedy}" if n.remedy else n.message for n in found)
        self.app.push_screen(Show("Notices", text or "Nothing to warn of."))

    def action_advice(self) -> None:
        if self.answered is None:
            return
        lines = [
            f"{m.bits:5.2f} bits, effort {m.cost:g}: {m.text}"
            for m in self.answered.analysis.advice[:14]
        ]
        self.app.push_screen(
            Show("What to measure next", "\n".join(lines) or "No measurement would tell more.")
        )

    def action_export(self) -> None:
        if self.answered is None:
            return
        from phaseid.ui.work import export

        path = Path(self.answered.image.path)
        folder = path.parent / f"{path.stem}-candidates"
        try:
            written = export(self.answered, folder)
        except InputError as error:
            self.say(str(error))
            return
        self.say(f"Wrote {', '.join(p.name for p in written)} to {folder}.")

    def action_undo(self) -> None:
        self._step("undo", "Nothing to take back.", "Taken back")

    def action_redo(self) -> None:
        self._step("redo", "Nothing to do again.", "Done again")

    def _step(self, name: str, empty: str, word: str) -> None:
        if self.session is None:
            return
        label = getattr(self.session, name)()
        if label is None:
            self.say(empty)
            return
        self.say(f"{word}: {label}.")
        self.rank(quiet=True)

    def action_help(self, first: bool = False) -> None:
        keys = "\n".join(f"{_key(a.key):>6}  {a.help}" for a in self.actions)
        hint = "\n".join(HINT)
        where = self.app.focused.id if self.app.focused is not None else ""
        part = _PARTS.get(where or "", "")
        text = hint if first else f"{part}\n\n{keys}\n\n{hint}".strip()
        self.app.push_screen(Show("Five lines to begin with" if first else "Help", text))

    def action_quit(self) -> None:
        self.app.exit()


_PARTS = {
    "clusters": "Clusters: up and down choose one; everything else follows it.",
    "candidates": "Candidates of the selected cluster; those with one letter cannot be told apart by grey.",
    "picture": "Picture: the arrows move the cursor, + and - zoom, f selects what is under it.",
}


def _key(key: str) -> str:
    return {"question_mark": "?", "plus": "+", "minus": "-"}.get(key, key)


def _words(text: str) -> list[str]:
    return [w for w in text.replace(",", " ").split() if w]


def _number(text: str) -> float | None:
    try:
        value = float(text)
    except ValueError:
        return None
    return value if abs(value) < 1e12 else None
