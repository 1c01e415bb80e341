"""Evidence, conditions and decisions: each action asks what it needs and hands a new state over."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from phaseid.ui.acting import Acting, number
from phaseid.ui.dialogs import Ask, Pick, PickSeveral, Show

if TYPE_CHECKING:
    from phaseid.session.answers import Candidate


class Asking(Acting):
    """Evidence, conditions and decisions; mixed into the bench."""

    # --- evidence ---

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
            lambda phase: self.mark("known", phase) if phase else None,
        )

    def action_forget(self) -> None:
        session, cluster = self.session, self.cluster
        if session is None or cluster is None:
            return
        kept = tuple(m for m in session.state.marks if not self.is_about(m, cluster))
        if kept == session.state.marks:
            self.say(f"Nothing was said about cluster {cluster.id}.")
            return
        self.take(f"forgot what was said about cluster {cluster.id}", self.with_state(marks=kept))

    def _ask_elements(self, kind: str, title: str) -> None:
        if self.cluster is None:
            return
        self.app.push_screen(
            Ask(f"{title} of cluster {self.cluster.id}", "for example Fe, O"),
            lambda text: self.mark(kind, ",".join(_words(text))) if text else None,
        )

    def action_seen(self) -> None:
        self._ask_elements("seen", "Elements seen in the X-ray spectrum")

    def action_unseen(self) -> None:
        self._ask_elements("unseen", "Elements looked for and not found in the spectrum")

    def action_content(self) -> None:
        if self.cluster is not None:
            self.app.push_screen(
                Ask(f"Content of cluster {self.cluster.id} in mass per cent", "Fe=60, O=30"),
                lambda text: self.mark("content", text.replace(" ", "")) if text else None,
            )

    def action_standard(self) -> None:
        self.app.push_screen(
            Ask("A standard imaged at the same settings", "GREY=FORMULA, for example 200=Cu"),
            self._standard,
        )

    def _standard(self, text: str | None) -> None:
        if not text:
            return
        grey, found, formula = text.partition("=")
        value = number(grey)
        if not found or value is None or not formula.strip():
            self.say(f"{text!r} is not of the form GREY=FORMULA.")
            return
        self.mark("standard", formula.strip(), grey=value)

    def action_dark(self) -> None:
        self.app.push_screen(Ask("Grey with no beam", "for example 12"), self._dark)

    def _dark(self, text: str | None) -> None:
        if text:
            value = number(text)
            if value is None:
                self.say(f"{text!r} is no grey.")
            else:
                self.mark("dark", grey=value)

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
        numbers = {n: number(told[n]) for n in ("energy", "tilt") if told.get(n)}
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
        value = number(text or "")
        if value is None:
            self.say("Nothing can be predicted without the beam energy; e sets it.")
            return
        self.take(f"beam energy {value:g} keV", self.with_state(energy_keV=value))

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

        session, state, index = self.session, self.session.state, self.index

        def switch(changed: str) -> None:
            self.app.push_screen(Show(f"What {name} changes", changed))
            self.take(f"eta model {name}", self.with_state(model=name))

        self.say(f"Comparing with {name}…")
        self.aside(lambda: compare_models(session, state, index, name), switch)

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
        self.mark("accepted", chosen.name, note)
        self.session.remember(chosen.name, self.answered.image.sha256, grey, note)

    def action_reject(self) -> None:
        chosen = self.chosen
        if chosen is not None:
            self.app.push_screen(
                Ask(f"Reject {chosen.name}; the reason?", "may stay empty"),
                lambda why: self.mark("rejected", chosen.name, why) if why is not None else None,
            )

    def action_list(self) -> None:
        if self.cluster is not None:
            self.app.push_screen(
                Pick(
                    f"Add a phase to the list of cluster {self.cluster.id}",
                    "name, formula or part of a name",
                    self._search,
                ),
                lambda phase: self.mark("listed", phase) if phase else None,
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


def _words(text: str) -> list[str]:
    return [w for w in text.replace(",", " ").split() if w]
