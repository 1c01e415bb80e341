"""One piece of work: what was opened, said and decided, with undo, and the answer to it.

The command line, the terminal screen and Python all drive this class; none of them computes anything.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from pathlib import Path

from phaseid.errors import InputError
from phaseid.image.clustering import Clustering
from phaseid.image.reading import GreyImage
from phaseid.session.analysis import TOP, Picture, analyse
from phaseid.session.answers import Analysis, Notice
from phaseid.session.knowledge import Knowledge
from phaseid.session.pictures import Pictures
from phaseid.session.state import Edit, EditKind, History, ImageRef, Mark, MarkKind, State, Step
from phaseid.session.store import load, save

Progress = Callable[[float, str], None]


class Session:
    """State, history and answers of one piece of work.

    Parameters
    ----------
    knowledge : Knowledge
        Databases, contexts and plugins.
    state : State
    file : Path or None
        Where every action is saved; None keeps the work in memory.
    history : History
    """

    def __init__(
        self,
        knowledge: Knowledge,
        state: State | None = None,
        file: Path | None = None,
        history: History | None = None,
    ) -> None:
        self.knowledge = knowledge
        self.state = state or State()
        self.file = file
        self.history = history or History()
        self.pictures = Pictures()

    @classmethod
    def reopen(cls, file: Path, knowledge: Knowledge) -> Session:
        """Open a session file where it was left.

        Raises
        ------
        InputError
            If the file cannot be read.
        """
        state, history = load(file)
        return cls(knowledge, state, file, history)

    # --- actions: each gives a new state that `attempt` or `apply` takes up ---

    def apply(self, label: str, state: State) -> None:
        """Take up a new state and save it; `label` says in words what was done."""
        if state == self.state:
            return
        past = (*self.history.past, Step(label, self.state))
        self._move(state, History(past, ()))

    def attempt(self, label: str, state: State) -> list[Analysis]:
        """Take up a new state only if it can be answered.

        Raises
        ------
        InputError
            If the new state contradicts itself; the old one stays.
        """
        answers = self.answers(state=state)
        self.apply(label, state)
        return answers

    def undo(self) -> str | None:
        """Go one action back; gives its label, or None where there is nothing to undo."""
        if not self.history.past:
            return None
        last = self.history.past[-1]
        future = (Step(last.label, self.state), *self.history.future)
        self._move(last.before, History(self.history.past[:-1], future))
        return last.label

    def redo(self) -> str | None:
        """Do again what was undone; gives its label, or None."""
        if not self.history.future:
            return None
        first = self.history.future[0]
        past = (*self.history.past, Step(first.label, self.state))
        self._move(first.before, History(past, self.history.future[1:]))
        return first.label

    def _move(self, state: State, history: History) -> None:
        if self.file is not None:
            save(self.file, state, history)
        self.state, self.history = state, history

    def with_image(self, path: str | Path, page: int | None = None) -> State:
        """The state with one more image.

        Raises
        ------
        InputError
            If the image cannot be read.
        """
        ref = ImageRef(str(path), page=page)
        image = self.pictures.image(ref)
        return replace(self.state, images=(*self.state.images, replace(ref, sha256=image.sha256)))

    def with_mark(
        self, kind: MarkKind, grey: float, value: str = "", note: str = "", image: int = 0
    ) -> State:
        """The state with one more thing said; a new word on the same matter replaces the old one."""
        mark = Mark(kind, grey, value, note, image)
        single = {"known", "named", "accepted", "ignored"}
        kept = tuple(
            m
            for m in self.state.marks
            if not (
                m.kind == kind
                and m.image == image
                and m.grey == grey
                and (kind in single or m.value == value)
            )
        )
        return replace(self.state, marks=(*kept, mark))

    def with_edit(
        self, kind: EditKind, numbers: Sequence[float] = (), path: str = "", image: int = 0
    ) -> State:
        """The state with one more change to the clusters of an image."""
        edit = Edit(kind, tuple(float(n) for n in numbers), path, image)
        kept = self.state.edits
        if kind == "count":
            kept = tuple(e for e in kept if not (e.kind == "count" and e.image == image))
        return replace(self.state, edits=(*kept, edit))

    def remember(self, phase: str, image_sha256: str, grey: float, note: str = "") -> None:
        """Keep an accepted identification for this laboratory."""
        if self.knowledge.learned is not None:
            contexts = self.knowledge.check_contexts(self.state.contexts)
            self.knowledge.learned.accept(contexts, phase, image_sha256, grey, note)

    # --- answers ---

    def image(self, index: int) -> GreyImage:
        """One of the session's images.

        Raises
        ------
        InputError
            If the file cannot be read.
        """
        return self.pictures.image(self.state.images[index])

    def clustering(
        self, index: int, progress: Progress | None = None, state: State | None = None
    ) -> Clustering:
        """Clusters of one image, as the user has edited them."""
        state = state or self.state
        return self.pictures.clustering(state.images[index], _edits(state, index), progress)

    def notices(self, index: int, state: State | None = None) -> list[Notice]:
        """Warnings of one image: its fitness, its clusters, and whether it has changed."""
        state = state or self.state
        ref = state.images[index]
        seen = self.pictures.summary(ref, _edits(state, index))
        found = [Notice(f.code, f.message, f.remedy) for f in seen.findings]
        found += self.knowledge.notices()
        if ref.sha256 and seen.sha256 != ref.sha256:
            found.insert(
                0,
                Notice(
                    "image-changed",
                    f"{ref.path} is not the file this session was made with.",
                    "Restore the file, or check everything that was said about it.",
                ),
            )
        return found

    def answers(
        self,
        *,
        state: State | None = None,
        top: int = TOP,
        with_advice: bool = True,
        progress: Progress | None = None,
    ) -> list[Analysis]:
        """Rank all clusters of all images: one analysis for a series, else one per image.

        Parameters
        ----------
        state : State or None
            None takes the present state.
        top : int
        with_advice : bool
        progress : callable or None
            Called with a share of 1 and a word.

        Returns
        -------
        list of Analysis

        Raises
        ------
        InputError
            If an image cannot be read, or conditions or evidence cannot be used.
        """
        state = state or self.state
        if not state.images:
            raise InputError("There is no image to analyse; give at least one.")
        count = len(state.images)
        pictures = []
        for i in range(count):
            part = None if progress is None else _part(progress, i, count)
            pictures.append(self._picture(i, state, part))
        groups = [pictures] if state.same_settings else [[p] for p in pictures]
        return [
            analyse(state, self.knowledge, group, top=top, with_advice=with_advice)
            for group in groups
        ]

    def answer_of(
        self,
        index: int,
        *,
        state: State | None = None,
        top: int = TOP,
        with_advice: bool = True,
        progress: Progress | None = None,
    ) -> Analysis:
        """Rank the clusters of one image on its own grey scale; parameters as for `answers`.

        Raises
        ------
        InputError
            As for `answers`.
        """
        state = state or self.state
        picture = self._picture(index, state, progress)
        return analyse(state, self.knowledge, [picture], top=top, with_advice=with_advice)

    def _picture(self, index: int, state: State, progress: Progress | None) -> Picture:
        ref = state.images[index]
        seen = self.pictures.summary(ref, _edits(state, index), progress)
        return Picture(
            index, ref.path, seen.energy_keV, seen.tilt_deg, seen.clusters, seen.diameters_um
        )


def _edits(state: State, index: int) -> tuple[Edit, ...]:
    return tuple(e for e in state.edits if e.image == index)


def _part(progress: Progress, index: int, count: int) -> Progress:
    return lambda share, word: progress((index + share) / count, word)
