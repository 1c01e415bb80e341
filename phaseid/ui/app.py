"""The terminal screen of ``phaseid triage``."""

from __future__ import annotations

from collections.abc import Iterable
from typing import ClassVar

from textual.app import App, SystemCommand
from textual.binding import BindingType
from textual.screen import Screen

from phaseid.ui.actions import Action
from phaseid.ui.bench import Bench
from phaseid.ui.work import Plan


class Triage(App[None]):
    """One bench, with every action in the command palette.

    Parameters
    ----------
    plan : Plan
        What to open.
    actions : tuple of Action
        The actions with the user's keys.
    first_time : bool
        Whether to show the hint of five lines.
    """

    TITLE = "phaseid"
    BINDINGS: ClassVar[list[BindingType]] = []

    def __init__(self, plan: Plan, actions: tuple[Action, ...], first_time: bool = False) -> None:
        super().__init__()
        self.bench = Bench(plan, actions, first_time)
        self.actions = actions

    def on_mount(self) -> None:
        self.push_screen(self.bench)

    def get_system_commands(self, screen: Screen[object]) -> Iterable[SystemCommand]:
        for one in self.actions:
            yield SystemCommand(
                one.label, f"{one.help} Key: {one.key}.", getattr(self.bench, f"action_{one.name}")
            )
        yield from super().get_system_commands(screen)
