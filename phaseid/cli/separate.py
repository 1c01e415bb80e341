"""phaseid separate PHASE PHASE..."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import click

from phaseid.cli.options import build_state, conditions_options, database_option
from phaseid.cli.terminal import console
from phaseid.errors import InputError


def _numbers(text: str | None, option: str, default: tuple[float, ...]) -> tuple[float, ...]:
    if text is None:
        return default
    try:
        return tuple(float(part) for part in text.split(","))
    except ValueError:
        raise InputError(f"{option} {text!r} is not a list of numbers such as 5,10,20.") from None


@click.command(name="separate", help="Say which phases can be told apart, at which beam energy.")
@click.argument("phases", nargs=-1, metavar="PHASE...")
@click.option(
    "--context",
    "contexts",
    multiple=True,
    metavar="NAME",
    help="Take the leading phases of a context.",
)
@click.option("--energies", metavar="5,10,20", help="Beam energies in keV.")
@click.option("--tilts", metavar="0,30", help="Tilts in degrees.")
@click.option(
    "--noise",
    type=float,
    metavar="SHARE",
    help="Noise of a pixel as a share of its grey, e.g. 0.03.",
)
@click.option(
    "--pixels",
    type=click.FloatRange(1),
    default=1.0,
    metavar="N",
    help="Pixels averaged in each region.",
)
@click.option("--json", "as_json", is_flag=True, help="Print the separation document.")
@click.option(
    "--plot",
    type=click.Path(path_type=Path),
    metavar="FILE.png",
    help="Write a plot of contrast against beam energy.",
)
@conditions_options
@database_option
def command(
    phases: tuple[str, ...],
    contexts: tuple[str, ...],
    energies: str | None,
    tilts: str | None,
    noise: float | None,
    pixels: float,
    as_json: bool,
    plot: Path | None,
    **options: Any,
) -> int:
    from phaseid.session.separating import DEFAULT_ENERGIES, separation

    energy, tilt = options.get("energy"), options.get("tilt")
    document = separation(
        build_state(contexts=contexts, **options),
        phases,
        energies_keV=_numbers(energies, "--energies", (energy,) if energy else DEFAULT_ENERGIES),
        tilts_deg=_numbers(tilts, "--tilts", (tilt,) if tilt is not None else (0.0,)),
        noise=noise,
        pixels=pixels,
    )
    if plot is not None:
        from phaseid.files import write_bytes
        from phaseid.report.figure import to_bytes
        from phaseid.report.separation import plot_separation

        write_bytes(plot, to_bytes(plot_separation(document)))
        click.echo(f"wrote {plot}", err=True)
    if as_json:
        click.echo(json.dumps(document, indent=1, ensure_ascii=False, allow_nan=False))
        return 0
    from phaseid.report.separation import separation_table

    console().print(separation_table(document))
    return 0
