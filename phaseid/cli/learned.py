"""phaseid learned list|clear"""

from __future__ import annotations

import json

import click


@click.group(name="learned", help="Show or clear what this laboratory has accepted.")
def command() -> None:
    pass


@command.command(name="list", help="How often each phase was accepted, per context.")
@click.option("--json", "as_json", is_flag=True, help="Print as JSON.")
def list_counts(as_json: bool) -> int:
    from phaseid.session.learned import Learned

    store = Learned()
    counts = store.counts()
    if as_json:
        entries = [{"context": c.context, "phase": c.phase, "count": c.count} for c in counts]
        click.echo(json.dumps({"schema": "phaseid-learned/1", "counts": entries}, indent=2))
        return 0
    if not counts:
        click.echo(f"Nothing accepted yet in {store.path}.")
    for count in counts:
        click.echo(f"{count.count:5d}  {count.phase}  ({count.context or 'no context'})")
    return 0


@command.command(name="clear", help="Forget one context, or everything.")
@click.option("--context", metavar="NAME", help="Forget this context only.")
@click.option("--yes", is_flag=True, help="Do not ask.")
def clear(context: str | None, yes: bool) -> int:
    from phaseid.session.learned import Learned

    what = f"the identifications of {context}" if context else "all identifications"
    if not yes:
        click.confirm(f"Forget {what}?", abort=True)
    click.echo(f"Forgot {Learned().clear(context)} identifications.")
    return 0
