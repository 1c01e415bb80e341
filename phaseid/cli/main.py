"""Entry point: commands are imported only when they are called, so that help is instant."""

from __future__ import annotations

import importlib
import os
import sys
from collections.abc import Sequence
from enum import IntEnum

import click

import phaseid
from phaseid.errors import InputError


class ExitStatus(IntEnum):
    """What the exit status means."""

    DONE = 0
    BAD_INPUT = 2
    SOME_FAILED = 3
    INTERRUPTED = 130


# Name of each command, the module and function behind it, and its line in the help.
COMMANDS = {
    "candidates": ("candidates", "Rank the phases each grey level of an image can be."),
    "predict": ("predict", "Predict mean atomic number, eta and signal of formulas."),
    "separate": ("separate", "Say which phases can be told apart, at which beam energy."),
    "triage": ("triage", "Work on an image interactively in the terminal."),
    "report": ("report", "Write a report of a session or an image."),
    "database": ("database", "List, show, check, import and add phases."),
    "plugins": ("plugins", "List plugins and contexts."),
    "quadrants": ("quadrants", "Combine the four images of a divided detector."),
    "learned": ("learned", "Show or clear what this laboratory has accepted."),
}


class LazyGroup(click.Group):
    """A group that imports a command's module when the command is used."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        if cmd_name not in COMMANDS:
            return None
        module = importlib.import_module(f"phaseid.cli.{COMMANDS[cmd_name][0]}")
        command: click.Command = module.command
        return command

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        with formatter.section("Commands"):
            formatter.write_dl([(name, line) for name, (_, line) in COMMANDS.items()])


@click.group(cls=LazyGroup, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(phaseid.__version__, prog_name="phaseid")
def cli() -> None:
    """From a backscattered-electron image to a ranked, defensible list of candidate phases."""


def main(arguments: Sequence[str] | None = None) -> None:
    """Run the command line and exit.

    Exit status: 0 done; 2 bad input, one sentence on standard error; 3 some images of several failed,
    the rest written; 130 interrupted.
    """
    sys.exit(run(arguments))


def run(arguments: Sequence[str] | None = None) -> int:
    """Run the command line and return the exit status."""
    try:
        status = cli.main(
            args=None if arguments is None else list(arguments),
            prog_name="phaseid",
            standalone_mode=False,
        )
        return int(status or 0)
    except InputError as error:
        return _failed(str(error))
    except click.exceptions.Exit as error:
        return int(error.exit_code)
    except click.UsageError as error:
        where = f" See '{error.ctx.command_path} --help'." if error.ctx else ""
        return _failed(f"{error.format_message()}{where}")
    except click.ClickException as error:
        return _failed(error.format_message())
    except (KeyboardInterrupt, click.Abort):
        click.echo("Interrupted; nothing was left half-written.", err=True)
        return ExitStatus.INTERRUPTED
    except MemoryError:
        return _failed("There is not enough memory for this; close other programs or take a crop.")
    except BrokenPipeError:
        # The reader of a pipe has seen enough; what is still buffered has nowhere to go.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return ExitStatus.DONE


def _failed(sentence: str) -> int:
    click.echo(f"phaseid: {' '.join(sentence.split())}", err=True)
    return ExitStatus.BAD_INPUT
