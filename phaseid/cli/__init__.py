"""The command line; thin."""

from phaseid.cli.main import main

__all__ = ["main"]
