"""phaseid candidates IMAGE..."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import Any

import click

from phaseid.cli.options import build_state, conditions_options, database_option, evidence_options
from phaseid.cli.terminal import console, progress_bar
from phaseid.errors import InputError


@click.command(name="candidates", help="Rank the phases each grey level of an image can be.")
@click.argument("images", nargs=-1, required=True, metavar="IMAGE...")
@conditions_options
@evidence_options
@database_option
@click.option(
    "--page", type=click.IntRange(0), metavar="N", help="Page of a multi-page file, from 0."
)
@click.option(
    "--exclude",
    multiple=True,
    metavar="ROW,COLUMN,HEIGHT,WIDTH|FILE",
    help="An area to leave out: a rectangle in pixels, or a mask image; repeatable.",
)
@click.option("--same-settings", is_flag=True, help="All images share one grey scale: a series.")
@click.option(
    "--top",
    type=click.IntRange(1, 100),
    default=5,
    show_default=True,
    metavar="N",
    help="Candidates listed per cluster.",
)
@click.option("--json", "as_json", is_flag=True, help="Print the candidates document.")
@click.option(
    "--out",
    type=click.Path(path_type=Path),
    metavar="DIR",
    help="Write JSON, CSV, a label TIFF and a figure for each image.",
)
@click.option("--resume", is_flag=True, help="With --out: skip images whose documents are there.")
@click.option(
    "--save",
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="Write a session file that 'phaseid triage' opens.",
)
@click.option("--quiet", is_flag=True, help="No progress, no tables.")
def command(
    images: tuple[str, ...],
    clusters: int | None,
    page: int | None,
    exclude: tuple[str, ...],
    top: int,
    as_json: bool,
    out: Path | None,
    resume: bool,
    save: Path | None,
    quiet: bool,
    **options: Any,
) -> int:
    from phaseid.batch import Job, run

    state = build_state(**options)
    job = Job(
        images=images,
        state=state,
        clusters=clusters,
        page=page,
        exclude=exclude,
        top=top,
        out=out,
        resume=resume,
        session_file=save,
    )
    with progress_bar(enabled=not quiet and sys.stderr.isatty()) as progress:
        outcome = run(job, progress)
    if as_json:
        from phaseid.report.document import to_text

        click.echo(to_text(outcome.documents), nl=False)
    elif not quiet:
        from phaseid.report.terminal import show

        show(console(), outcome.documents)
    for failure in outcome.failures:
        click.echo(f"phaseid: {' '.join(failure.split())}", err=True)
    for line in outcome.written:
        if not quiet and not as_json:
            click.echo(f"wrote {line}", err=True)
    if outcome.failures and len(outcome.failures) == len(images):
        return 2
    if not outcome.documents and not outcome.skipped:
        raise InputError("No image could be analysed; see the messages above.")
    return 3 if outcome.failures else 0
