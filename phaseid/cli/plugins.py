"""phaseid plugins list|contexts"""

from __future__ import annotations

import json

import click


@click.group(name="plugins", help="List plugins and contexts.")
def command() -> None:
    pass


@command.command(name="list", help="List the plugins, what each adds, and those that failed.")
@click.option("--json", "as_json", is_flag=True, help="Print as JSON.")
def list_plugins(as_json: bool) -> int:
    from phaseid.hooks.host import make_host

    listing = make_host().listing()
    if as_json:
        click.echo(json.dumps({"schema": "phaseid-plugins/1", "plugins": listing}, indent=2))
        return 0
    for entry in listing:
        click.echo(f"{entry['name']:<32} {entry['summary']}")
        if entry.get("problem"):
            click.echo(f"{'':<32} skipped: {entry['problem']}")
    return 0


@command.command(name="contexts", help="List the contexts as a tree.")
def list_contexts() -> int:
    from phaseid.session.knowledge import Knowledge

    for context in Knowledge.load().contexts.all():
        depth = context.path.count("/")
        click.echo(f"{'  ' * depth}{context.path}  {context.title}")
    return 0
