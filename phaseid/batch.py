"""Many images: one after the other or as a series, resumable, in bounded memory."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Callable, Iterator, Sequence
from dataclasses import asdict, dataclass, field, replace
from pathlib import Path
from typing import Any

import phaseid
from phaseid.errors import InputError
from phaseid.files import write_bytes, write_text
from phaseid.image.clustering import Clustering
from phaseid.image.reading import GreyImage
from phaseid.report.document import document, to_text
from phaseid.report.rows import to_csv
from phaseid.session.answers import Analysis
from phaseid.session.knowledge import Knowledge
from phaseid.session.state import Edit, State
from phaseid.session.work import Session

Progress = Callable[[float, str], None]


@dataclass(frozen=True)
class Job:
    """What to do with a set of images.

    Attributes
    ----------
    images : sequence of str
    state : State
        Conditions and evidence; marks count for every image.
    clusters : int or None
        Force the number of clusters.
    page : int or None
    exclude : sequence of str
        Areas to leave out: ROW,COLUMN,HEIGHT,WIDTH or a mask file.
    top : int
    out : Path or None
        Folder for files.
    resume : bool
        Skip images whose documents are in `out` and were made from the same file and options.
    session_file : Path or None
    """

    images: Sequence[str]
    state: State
    clusters: int | None = None
    page: int | None = None
    exclude: Sequence[str] = ()
    top: int = 5
    out: Path | None = None
    resume: bool = False
    session_file: Path | None = None


@dataclass
class Outcome:
    """What came of a job: documents, files written, images skipped, and one sentence per failure."""

    documents: list[dict[str, Any]] = field(default_factory=list)
    written: list[Path] = field(default_factory=list)
    skipped: list[str] = field(default_factory=list)
    failures: list[str] = field(default_factory=list)


def run(job: Job, progress: Progress | None = None, knowledge: Knowledge | None = None) -> Outcome:
    """Run a job.

    Parameters
    ----------
    job : Job
    progress : callable or None
    knowledge : Knowledge or None
        None loads what ships and what is installed.

    Returns
    -------
    Outcome
        Images that failed are named in `failures`; the others are done.

    Raises
    ------
    InputError
        For anything that concerns all images: an unknown context, a wrong database file, no energy.
    """
    knowledge = knowledge or Knowledge.load(job.state.databases)
    knowledge.check_contexts(job.state.contexts)
    outcome = Outcome()
    if job.state.same_settings and len(job.images) > 1:
        _series(job, knowledge, outcome, progress)
    else:
        _one_by_one(job, knowledge, outcome, progress)
    if job.out is not None and len(job.images) > 1 and outcome.documents:
        _write(job.out / "candidates.jsonl", to_text([*outcome.documents, {}][:-1]), outcome)
        _write(job.out / "candidates.csv", to_csv(outcome.documents), outcome)
    return outcome


def _one_by_one(
    job: Job, knowledge: Knowledge, outcome: Outcome, progress: Progress | None
) -> None:
    for i, (path, folder) in enumerate(zip(job.images, _folders(job), strict=True)):
        step = None if progress is None else _part(progress, i, len(job.images), Path(path).name)
        if job.resume and folder is not None:
            kept = _finished(job, path, folder)
            if kept is not None:
                outcome.documents.append(kept)
                outcome.skipped.append(path)
                continue
        try:
            # A session of its own for every image: its pixels are gone before the next is read.
            session = _session(job, knowledge, [path])
            analysis = session.answers(top=job.top, progress=step)[0]
        except InputError as error:
            if len(job.images) == 1:
                raise
            outcome.failures.append(str(error))
            continue
        _deliver(job, session, analysis, 0, folder, outcome)


def _series(job: Job, knowledge: Knowledge, outcome: Outcome, progress: Progress | None) -> None:
    readable = []
    for path in job.images:
        try:
            _session(job, knowledge, [path])
        except InputError as error:
            outcome.failures.append(str(error))
        else:
            readable.append(path)
    if not readable:
        return
    session = _session(job, knowledge, readable)
    analysis = session.answers(top=job.top, progress=progress)[0]
    folders = dict(zip(job.images, _folders(job), strict=True))
    for i, path in enumerate(readable):
        _deliver(job, session, analysis, i, folders[path], outcome)


def _session(job: Job, knowledge: Knowledge, paths: Sequence[str]) -> Session:
    session = Session(knowledge, job.state)
    for path in paths:
        session.state = session.with_image(path, job.page)
    edits = []
    for i in range(len(paths)):
        edits += [_exclusion(text, i) for text in job.exclude]
        if job.clusters is not None:
            edits.append(Edit("count", (float(job.clusters),), image=i))
    session.state = replace(session.state, edits=tuple(edits))
    return session


def _exclusion(text: str, image: int) -> Edit:
    parts = text.split(",")
    if len(parts) == 4:
        try:
            return Edit("rectangle", tuple(float(p) for p in parts), image=image)
        except ValueError:
            pass
    if Path(text).is_file():
        return Edit("mask", path=text, image=image)
    raise InputError(
        f"--exclude {text!r} is neither ROW,COLUMN,HEIGHT,WIDTH nor a mask image that exists; "
        "write for example --exclude 880,0,60,1024."
    )


def _deliver(
    job: Job,
    session: Session,
    analysis: Analysis,
    index: int,
    folder: Path | None,
    outcome: Outcome,
) -> None:
    made = document(analysis, index, session.image(index), session.notices(index), job.top)
    if folder is not None:
        write_all(folder, made, session.image(index), session.clustering(index), outcome.written)
        _write(folder / ".made-from.json", _signature_text(job, made["image"]["sha256"]), None)
    outcome.documents.append(made)
    if job.session_file is not None and index == 0:
        from phaseid.session.store import save

        save(job.session_file, session.state, session.history)
        outcome.written.append(job.session_file)


def write_all(
    folder: Path,
    made: dict[str, Any],
    image: GreyImage,
    clustering: Clustering,
    written: list[Path],
) -> None:
    """Write the documents of one image: JSON, CSV, a label TIFF and the figure.

    Parameters
    ----------
    folder : Path
    made : dict
        Candidates document.
    image : GreyImage
    clustering : Clustering
    written : list of Path
        The files are added to it.

    Raises
    ------
    InputError
        If the folder cannot be written.
    """
    from phaseid.report.figure import figure, to_bytes
    from phaseid.report.labels import label_tiff

    contents = {
        "labels.tif": label_tiff(clustering, image.pixel_size_nm),
        "figure.png": to_bytes(figure(image, clustering, made)),
        "candidates.csv": to_csv([made]).encode("utf-8"),
        # The document is written last: where it is, the others are there too.
        "candidates.json": to_text([made]).encode("utf-8"),
    }
    for name, content in contents.items():
        write_bytes(folder / name, content)
        written.append(folder / name)


def _folders(job: Job) -> Iterator[Path | None]:
    """One folder per image; a single image goes straight into the output folder."""
    if job.out is None:
        yield from [None] * len(job.images)
        return
    if len(job.images) == 1:
        yield job.out
        return
    used: set[str] = set()
    for path in job.images:
        name = stem = Path(path).stem
        number = 1
        while name.casefold() in used:
            number += 1
            name = f"{stem}-{number}"
        used.add(name.casefold())
        yield job.out / name


def _finished(job: Job, path: str, folder: Path) -> dict[str, Any] | None:
    """The document of an earlier run with the same file and options, if it is whole."""
    try:
        made = json.loads((folder / "candidates.json").read_text(encoding="utf-8"))
        signature = (folder / ".made-from.json").read_text(encoding="utf-8")
        sha256 = hashlib.sha256(Path(path).read_bytes()).hexdigest()
    except (OSError, ValueError):
        return None
    if signature != _signature_text(job, sha256):
        return None
    return dict(made)


def _signature_text(job: Job, sha256: str) -> str:
    data = {
        "phaseid": phaseid.__version__,
        "sha256": sha256,
        "state": asdict(replace(job.state, images=())),
        "clusters": job.clusters,
        "page": job.page,
        "exclude": list(job.exclude),
        "top": job.top,
    }
    return json.dumps(data, sort_keys=True) + "\n"


def _write(path: Path, text: str, outcome: Outcome | None) -> None:
    write_text(path, text)
    if outcome is not None:
        outcome.written.append(path)


def _part(progress: Progress, index: int, count: int, name: str) -> Progress:
    return lambda share, word: progress((index + share) / count, f"{name}: {word}")
