"""phaseid triage IMAGE...|SESSION"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import click

from phaseid.cli.options import build_state, conditions_options, database_option, evidence_options
from phaseid.errors import InputError


@click.command(name="triage", help="Work on an image interactively in the terminal.")
@click.argument("sources", nargs=-1, required=True, metavar="IMAGE...|SESSION")
@click.option(
    "--session",
    "file",
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="Session file; beside the image by default.",
)
@click.option("--same-settings", is_flag=True, help="All images share one grey scale.")
@conditions_options
@evidence_options
@database_option
def command(
    sources: tuple[str, ...], file: Path | None, clusters: int | None, **options: Any
) -> int:
    from dataclasses import replace

    from phaseid.session.state import Edit
    from phaseid.ui.actions import keys_file, remapped
    from phaseid.ui.work import Plan

    for source in sources:
        if not Path(source).is_file():
            raise InputError(f"{source} is no file; give an image or a session file.")
    state = build_state(**options)
    if clusters is not None:
        state = replace(state, edits=(Edit("count", (float(clusters),)),))
    actions = remapped()
    from phaseid.ui.app import Triage

    seen = keys_file().with_name("hint-shown")
    first_time = not seen.exists()
    if first_time:
        # Noted before it is shown: whoever is interrupted has seen it all the same.
        try:
            seen.parent.mkdir(parents=True, exist_ok=True)
            seen.touch()
        except OSError:
            pass
    app = Triage(Plan(sources, state, file), actions, first_time)
    app.run()
    return app.return_code or 0
