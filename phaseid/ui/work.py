"""What runs in a thread: opening the work and answering it. Plain functions; no widget in sight."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING

from phaseid.errors import InputError

if TYPE_CHECKING:
    from phaseid.image.clustering import Clustering
    from phaseid.image.reading import GreyImage
    from phaseid.session.answers import Analysis, Notice
    from phaseid.session.state import State
    from phaseid.session.work import Session

Progress = Callable[[float, str], None]

SUFFIX = ".phaseid.json"


@dataclass(frozen=True)
class Plan:
    """What to open.

    Attributes
    ----------
    sources : tuple of str
        Images, or one session file.
    state : State
        What was said on the command line; used for a new session only.
    file : Path or None
        Session file; None takes one beside the first image.
    """

    sources: tuple[str, ...]
    state: State
    file: Path | None = None


@dataclass(frozen=True)
class Opened:
    """An opened session and what to tell about it."""

    session: Session
    message: str


@dataclass(frozen=True)
class Answer:
    """Everything the screen shows of one image under one state."""

    analysis: Analysis
    image: GreyImage
    clustering: Clustering
    notices: tuple[Notice, ...]
    index: int


def open_work(plan: Plan, progress: Progress) -> Opened:
    """Load what is known and open a session, an old one where there is one.

    Raises
    ------
    InputError
        If the session or an image cannot be read.
    """
    progress(0.05, "databases and plugins")
    from phaseid.session.knowledge import Knowledge
    from phaseid.session.store import looks_like_session
    from phaseid.session.work import Session

    first = Path(plan.sources[0])
    if looks_like_session(first):
        session = Session.reopen(first, Knowledge.load())
        session.knowledge = Knowledge.load(session.state.databases)
        return Opened(session, f"Reopened {first.name} where it was left.")
    knowledge = Knowledge.load(plan.state.databases)
    knowledge.check_contexts(plan.state.contexts)
    file = plan.file or session_file(first)
    if file.exists():
        session = Session.reopen(file, knowledge)
        added = _add_missing(session, plan.sources)
        told = f" Added {', '.join(added)}; i shows the next image." if added else ""
        return Opened(
            session,
            f"Reopened {file.name} where it was left, not with the options of the command line; "
            f"delete it to start anew.{told}",
        )
    session = Session(knowledge, plan.state)
    for n, source in enumerate(plan.sources):
        progress(0.1 + 0.2 * n / len(plan.sources), f"reading {Path(source).name}")
        session.state = session.with_image(source)
    session.file = file
    from phaseid.session.store import save

    save(file, session.state, session.history)
    return Opened(session, f"Every action is saved in {file}.")


def _add_missing(session: Session, sources: tuple[str, ...]) -> list[str]:
    """Take images the session does not have yet into it; each can be taken back."""
    added = []
    for source in sources:
        if Path(source).resolve() not in {Path(i.path).resolve() for i in session.state.images}:
            name = Path(source).name
            session.apply(f"added {name}", session.with_image(source))
            added.append(name)
    return added


def session_file(image: Path) -> Path:
    """Beside the image, or in the user's data folder where that cannot be written."""
    import os

    beside = image.with_name(image.stem + SUFFIX)
    if beside.exists() or os.access(image.parent, os.W_OK):
        return beside
    import hashlib

    import platformdirs

    tag = hashlib.sha256(str(image.resolve()).encode()).hexdigest()[:8]
    return platformdirs.user_data_path("phaseid") / f"{image.stem}-{tag}{SUFFIX}"


def answer(session: Session, state: State, index: int, progress: Progress) -> Answer:
    """Answer a state for one of its images.

    Raises
    ------
    InputError
        If the state cannot be answered.
    """
    if state.same_settings:
        analyses = session.answers(state=state, progress=progress)
    else:
        # Only the image that is shown; the others are answered when they are.
        analyses = [session.answer_of(index, state=state, progress=progress)]
    found = next(a for a in analyses if index in a.images)
    return Answer(
        found,
        session.image(index),
        session.clustering(index, state=state),
        tuple(session.notices(index, state=state)),
        index,
    )


def needs_energy(error: InputError) -> bool:
    """Whether a failure is about a beam energy that is not known."""
    return "--energy" in str(error)


def compare_models(session: Session, state: State, index: int, name: str) -> str:
    """What switching to another eta model changes, in words."""
    before = session.answer_of(index, state=state, with_advice=False)
    after = session.answer_of(index, state=replace(state, model=name), with_advice=False)
    lines = []
    for old, new in zip(before.of_image(index), after.of_image(index), strict=True):
        if old.candidates and new.candidates:
            first, second = old.candidates[0], new.candidates[0]
            lines.append(
                f"Cluster {old.id}: {first.name} {first.probability:.1%}"
                + (
                    f" -> {second.name} {second.probability:.1%}"
                    if second.name != first.name
                    else f" -> {second.probability:.1%}"
                )
            )
    return "\n".join(lines)


def export(answered: Answer, folder: Path) -> list[Path]:
    """Write the same files as ``phaseid candidates --out``.

    Raises
    ------
    InputError
        If the folder cannot be written.
    """
    from phaseid.batch import write_all
    from phaseid.report.document import document

    made = document(answered.analysis, answered.index, answered.image, answered.notices, top=5)
    written: list[Path] = []
    write_all(folder, made, answered.image, answered.clustering, written)
    return written
