"""phaseid database list|show|check|import|add"""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path
from typing import Any

import click

from phaseid.cli.options import build_state, conditions_options, database_option
from phaseid.cli.terminal import console
from phaseid.errors import InputError


@click.group(name="database", help="List, show, check, import and add phases.")
def command() -> None:
    pass


def _elements(text: str | None) -> tuple[str, ...]:
    return tuple(s.strip() for s in (text or "").split(",") if s.strip())


def _window(text: str | None, option: str) -> tuple[float, float] | None:
    if text is None:
        return None
    low, _, high = text.partition("-")
    try:
        return float(low), float(high or low)
    except ValueError:
        raise InputError(
            f"{option} {text!r} is not of the form LOW-HIGH, for example 10-12."
        ) from None


@command.command(name="list", help="List phases; filters combine.")
@click.argument("text", required=False)
@click.option("--with", "with_all", metavar="Fe,O", help="Elements that must be possible.")
@click.option("--without", "with_none", metavar="Mg", help="Elements that must not.")
@click.option("--formula", metavar="FORMULA", help="Same composition.")
@click.option("--mean-z", metavar="LOW-HIGH", help="Window of the mean atomic number.")
@click.option("--eta", metavar="LOW-HIGH", help="Window of eta.")
@click.option("--context", metavar="NAME", help="Listed for this context.")
@click.option("--in", "database_name", metavar="NAME", help="In this database.")
@click.option("--hazard", is_flag=True, help="Only phases with a hazard.")
@click.option("--json", "as_json", is_flag=True, help="Print the listing document.")
@click.option("--csv", "as_csv", is_flag=True, help="Print as CSV.")
@conditions_options
@database_option
def list_phases(
    text: str | None,
    with_all: str | None,
    with_none: str | None,
    formula: str | None,
    mean_z: str | None,
    eta: str | None,
    context: str | None,
    database_name: str | None,
    hazard: bool,
    as_json: bool,
    as_csv: bool,
    **options: Any,
) -> int:
    from phaseid.phases.lookup import Filters, listing, look_up, to_frame

    knowledge, table = _table(options)
    filters = Filters(
        text,
        _elements(with_all),
        _elements(with_none),
        formula,
        _window(mean_z, "--mean-z"),
        _window(eta, "--eta"),
        context,
        database_name,
        hazard,
    )
    positions = look_up(table, filters, knowledge.contexts)
    if as_json:
        click.echo(
            json.dumps(listing(table, positions), ensure_ascii=False, allow_nan=False, indent=1)
        )
    elif as_csv:
        click.echo(to_frame(table, positions).to_csv(index=False), nl=False)
    else:
        from phaseid.report.phases import phases_table

        console().print(phases_table(listing(table, positions)))
    return 0


def _table(options: dict[str, Any]) -> Any:
    from phaseid.phases.table import build
    from phaseid.session.knowledge import Knowledge
    from phaseid.session.settling import settle

    state = build_state(**options)
    knowledge = Knowledge.load(state.databases)
    for notice in knowledge.notices():
        click.echo(f"warning: {notice.message} {notice.remedy}", err=True)
    told = replace(state, energy_keV=state.energy_keV or 20.0)
    conditions, _ = settle(told, [], [], knowledge.model)
    return knowledge, build(knowledge.catalogue.phases, conditions)


@command.command(name="show", help="Everything known of one phase.")
@click.argument("phase")
@click.option("--json", "as_json", is_flag=True, help="Print as JSON.")
@conditions_options
@database_option
def show(phase: str, as_json: bool, **options: Any) -> int:
    from phaseid.phases.lookup import listing

    knowledge, table = _table(options)
    knowledge.catalogue.find(phase)
    position = knowledge.catalogue.index(phase)
    document = listing(table, [position])
    document["phases"][0] |= {
        "range_um": _finite(table.range_um[position]),
        "information_depth_um": _finite(table.information_depth_um[position]),
        "location": Path(table.phases[position].location.rsplit(":", 1)[0]).name,
    }
    if as_json:
        click.echo(json.dumps(document, ensure_ascii=False, indent=1))
        return 0
    from phaseid.report.phases import phase_sheet

    console().print(phase_sheet(document["phases"][0]))
    return 0


def _finite(value: float) -> float | None:
    return round(float(value), 6) if value == value else None


@command.command(
    name="check",
    help="Check what ships and plugins add, or given files; faults give exit status 2.",
)
@click.argument("files", nargs=-1, type=click.Path(path_type=Path))
@click.option("--json", "as_json", is_flag=True, help="Print as JSON.")
@click.option("--remarks", is_flag=True, help="Show remarks as well as faults.")
def check(files: tuple[Path, ...], as_json: bool, remarks: bool) -> int:
    from phaseid.phases.checks import Finding
    from phaseid.phases.checks import check as check_phases
    from phaseid.phases.database import DatabaseError, load
    from phaseid.session.knowledge import Knowledge

    knowledge = Knowledge.load()
    found: list[Finding] = []
    phases = list(knowledge.catalogue.phases) if not files else []
    for problem in knowledge.host.problems if not files else []:
        found.append(Finding("fault", problem.plugin, problem.moment, problem.message))
    for path in files:
        try:
            phases += load(path).phases
        except DatabaseError as error:
            found += [Finding("fault", "", str(path), fault) for fault in error.faults]
    found += check_phases(phases, knowledge.contexts)
    if files:
        # Contexts without a phase are no fault of a single file.
        found = [f for f in found if f.location]
    faults = [f for f in found if f.kind == "fault"]
    if as_json:
        entries = [
            {"kind": f.kind, "phase": f.phase, "location": f.location, "message": f.message}
            for f in found
        ]
        click.echo(json.dumps({"schema": "phaseid-check/1", "findings": entries}, indent=1))
    else:
        for finding in found:
            if remarks or finding.kind == "fault":
                click.echo(f"{finding.kind}: {finding.location} {finding.phase}: {finding.message}")
        click.echo(
            f"{len(phases)} phases, {len(faults)} faults, {len(found) - len(faults)} remarks"
        )
    return 2 if faults else 0


@command.command(
    name="import",
    help="Take phases from a CSV or XLSX file; nothing is written until all rows are clean.",
)
@click.argument("sheet", type=click.Path(path_type=Path))
@click.option(
    "--to",
    "target",
    type=click.Path(path_type=Path),
    metavar="FILE.yaml",
    help="Database file to write; without it only a preview.",
)
@click.option("--replace", "overwrite", is_flag=True, help="Replace FILE.yaml if it exists.")
def import_phases(sheet: Path, target: Path | None, overwrite: bool) -> int:
    from phaseid.phases.importing import preview, read_sheet
    from phaseid.phases.writing import write_database
    from phaseid.report.phases import preview_table
    from phaseid.session.knowledge import Knowledge

    knowledge = Knowledge.load()
    name = target.stem if target is not None else sheet.stem
    found = preview(read_sheet(sheet), knowledge.catalogue, knowledge.contexts, name)
    console().print(preview_table(found))
    for doubt in found.doubts:
        click.echo(f"check: {doubt}", err=True)
    if found.refused:
        raise InputError(
            f"{len(found.refused)} rows of {sheet} were refused; nothing was written: mend them first."
        )
    if target is None:
        click.echo("Preview only; add --to FILE.yaml to write.")
        return 0
    if target.exists() and not overwrite:
        raise InputError(f"{target} exists; add --replace to write over it.")
    write_database(target, name, found.phases)
    click.echo(f"wrote {target}: use it with --database {target}")
    return 0


@command.command(name="add", help="Add one phase to a database file of your own.")
@click.argument("target", type=click.Path(path_type=Path))
@click.argument("name")
@click.argument("formula")
@click.option(
    "--range",
    "ranges",
    multiple=True,
    metavar="x:LOW-HIGH",
    help="Range of a variable; repeatable.",
)
@click.option("--density", default="", metavar="G_CM3", help="Density, or LOW-HIGH.")
@click.option(
    "--context",
    "contexts",
    multiple=True,
    metavar="NAME[:WORD]",
    help="Context and abundance word; repeatable.",
)
@click.option("--crystal-system", default="", help="Crystal system.")
@click.option("--hazard", default="", help="One sentence of caution.")
@click.option("--note", default="", help="Where grey misleads.")
@click.option("--source", default="the laboratory's own list", show_default=True)
def add(
    target: Path,
    name: str,
    formula: str,
    ranges: tuple[str, ...],
    density: str,
    contexts: tuple[str, ...],
    crystal_system: str,
    hazard: str,
    note: str,
    source: str,
) -> int:
    from phaseid.phases.importing import preview
    from phaseid.phases.writing import append_phase
    from phaseid.session.knowledge import Knowledge

    knowledge = Knowledge.load()
    row = {
        "name": name,
        "formula": formula,
        "ranges": ";".join(ranges),
        "density": density,
        "contexts": ";".join(contexts),
        "crystal_system": crystal_system,
        "hazard": hazard,
        "note": note,
        "source": source,
    }
    found = preview(
        [{k: v for k, v in row.items() if v}], knowledge.catalogue, knowledge.contexts, target.stem
    )
    if found.refused:
        raise InputError(f"{name}: {found.refused[0].reason}; nothing was written.")
    count = append_phase(target, found.phases[0])
    for doubt in found.doubts:
        click.echo(f"check: {doubt}", err=True)
    click.echo(f"wrote {target}: {count} phases")
    return 0
