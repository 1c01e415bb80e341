"""phaseid predict FORMULA..."""

from __future__ import annotations

import json
from typing import Any

import click

from phaseid.cli.options import build_state, conditions_options, database_option
from phaseid.cli.terminal import console


@click.command(name="predict", help="Predict mean atomic number, eta and signal of formulas.")
@click.argument("formulas", nargs=-1, required=True, metavar="FORMULA...")
@conditions_options
@database_option
@click.option("--density", type=float, metavar="G_CM3", help="Density, where a depth is wanted.")
@click.option("--json", "as_json", is_flag=True, help="Print the prediction document.")
@click.option("--models", is_flag=True, help="Show eta under every published model as well.")
def command(
    formulas: tuple[str, ...], density: float | None, as_json: bool, models: bool, **options: Any
) -> int:
    from phaseid.session.predicting import prediction

    state = build_state(**options)
    document = prediction(state, formulas, density=density, every_model=models)
    if as_json:
        click.echo(json.dumps(document, indent=2, ensure_ascii=False, allow_nan=False))
        return 0
    from phaseid.report.terminal import prediction_table

    console().print(prediction_table(document))
    return 0
