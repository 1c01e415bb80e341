"""Where tables and progress go: data on standard output, everything else on standard error."""

from __future__ import annotations

import contextlib
import shutil
import sys
from collections.abc import Callable, Iterator
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from rich.console import Console

Progress = Callable[[float, str], None]

# A pipe has no width; tables are then laid out for a wide page.
PIPE_WIDTH = 140


def console() -> Console:
    """A console on standard output that honours NO_COLOR and the width of the terminal."""
    from rich.console import Console

    if sys.stdout.isatty():
        return Console(highlight=False, width=max(60, shutil.get_terminal_size().columns))
    return Console(highlight=False, width=PIPE_WIDTH)


@contextlib.contextmanager
def progress_bar(enabled: bool) -> Iterator[Progress | None]:
    """Show progress on standard error."""
    if not enabled:
        yield None
        return
    from rich.console import Console
    from rich.progress import BarColumn, TaskProgressColumn, TextColumn, TimeRemainingColumn
    from rich.progress import Progress as Bar

    with Bar(
        TextColumn("{task.description}"),
        BarColumn(),
        TaskProgressColumn(),
        TimeRemainingColumn(),
        console=Console(stderr=True),
        transient=True,
    ) as bar:
        task = bar.add_task("", total=1.0)
        yield lambda share, word: bar.update(task, completed=share, description=word)
