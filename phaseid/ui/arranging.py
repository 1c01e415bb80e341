"""Clusters, series, files and the screen itself: the other actions of the bench."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from phaseid.ui.acting import Acting, number
from phaseid.ui.actions import HINT
from phaseid.ui.dialogs import Ask, Pick, Show
from phaseid.ui.widgets import ClusterList, Picture

if TYPE_CHECKING:
    from phaseid.session.answers import ClusterAnswer


class Arranging(Acting):
    """Clusters, series, files and the screen; mixed into the bench."""

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
                grey = number(text or "")
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
                lambda name: self.mark("named", name) if name else None,
            )

    def action_leave_out(self) -> None:
        session, cluster = self.session, self.cluster
        if session is None or cluster is None:
            return
        if cluster.observation is None:
            kept = tuple(
                m
                for m in session.state.marks
                if not (m.kind == "ignored" and self.is_about(m, cluster))
            )
            self.take(f"cluster {cluster.id} taken in again", self.with_state(marks=kept))
        else:
            self.mark("ignored")

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
        answered = self.answered
        self.say(f"Writing to {folder}…")
        self.aside(
            lambda: export(answered, folder),
            lambda written: self.say(f"Wrote {', '.join(p.name for p in written)} to {folder}."),
        )

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
        if name == "undo":
            self.unanswered = max(0, self.unanswered - 1)
        self.say(f"{word}: {label}.")
        self.rank(quiet=True)

    def action_help(self, first: bool = False) -> None:
        keys = "\n".join(f"{_key(a.key):>6}  {a.help}" for a in self.actions)
        hint = "\n".join(HINT)
        where = self.app.focused.id if self.app.focused is not None else ""
        part = _PARTS.get(where or "", "")
        palette = "Ctrl+P finds every action by name."
        text = hint if first else f"{part}\n\n{keys}\n\n{palette}\n\n{hint}".strip()
        self.app.push_screen(Show("Five lines to begin with" if first else "Help", text))

    def action_quit(self) -> None:
        # A thread that is still at work stops at its next step.
        self.run += 1
        self.app.exit()


_PARTS = {
    "clusters": "Clusters: up and down choose one; everything else follows it.",
    "candidates": "Candidates of the selected cluster; those with one letter cannot be told apart by grey.",
    "picture": "Picture: the arrows move the cursor, + and - zoom, f selects what is under it.",
}


def _key(key: str) -> str:
    return {"question_mark": "?", "plus": "+", "minus": "-"}.get(key, key)
