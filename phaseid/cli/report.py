"""phaseid report IMAGE|SESSION -o FILE"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import click

from phaseid.cli.options import build_state, conditions_options, database_option, evidence_options
from phaseid.errors import InputError


@click.command(
    name="report", help="Write a report (HTML, Markdown or DOCX) of an image or a session."
)
@click.argument("source", type=click.Path(path_type=Path), metavar="IMAGE|SESSION")
@click.option(
    "-o",
    "--output",
    type=click.Path(path_type=Path),
    required=True,
    metavar="FILE",
    help="report.html, report.md or report.docx.",
)
@click.option(
    "--image",
    "index",
    type=click.IntRange(1),
    default=1,
    show_default=True,
    metavar="N",
    help="Which image of a session.",
)
@click.option(
    "--top",
    type=click.IntRange(1, 100),
    default=8,
    show_default=True,
    metavar="N",
    help="Candidates per cluster.",
)
@conditions_options
@evidence_options
@database_option
def command(
    source: Path, output: Path, index: int, top: int, clusters: int | None, **options: Any
) -> int:
    from phaseid.files import write_bytes
    from phaseid.report.formats import FORMATS
    from phaseid.report.making import report_of
    from phaseid.session.knowledge import Knowledge
    from phaseid.session.store import load, looks_like_session
    from phaseid.session.work import Session

    writer = FORMATS.get(output.suffix.casefold())
    if writer is None:
        raise InputError(f"{output} must end in one of {', '.join(FORMATS)}.")
    if looks_like_session(source):
        state, history = load(source)
        session = Session(Knowledge.load(state.databases), state, None, history)
    else:
        state = build_state(**options)
        session = Session(Knowledge.load(state.databases), state)
        session.state = session.with_image(source)
        if clusters is not None:
            session.state = session.with_edit("count", [clusters])
    if index > len(session.state.images):
        raise InputError(
            f"The session has {len(session.state.images)} images; --image {index} is none."
        )
    write_bytes(output, writer(report_of(session, index - 1, top)))
    click.echo(f"wrote {output}", err=True)
    return 0
