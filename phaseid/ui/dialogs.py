"""Small questions on top of the screen; each returns a typed value, or None when it is left."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Vertical, VerticalScroll
from textual.screen import ModalScreen
from textual.widgets import Input, Label, OptionList, SelectionList, Static
from textual.widgets.selection_list import Selection

LEAVE: list[BindingType] = [Binding("escape", "leave", "leave", show=False)]


class _Dialog(ModalScreen[str | None]):
    CSS_PATH = "dialogs.tcss"
    BINDINGS: ClassVar[list[BindingType]] = LEAVE

    def action_leave(self) -> None:
        self.dismiss(None)


class Ask(_Dialog):
    """One line of text."""

    def __init__(self, title: str, hint: str = "", value: str = "") -> None:
        super().__init__()
        self.heading, self.hint, self.value = title, hint, value

    def compose(self) -> ComposeResult:
        with Vertical(classes="box"):
            yield Label(self.heading, classes="heading")
            yield Input(self.value, placeholder=self.hint)
            yield Label("Enter takes it, Escape leaves.", classes="dim")

    def on_input_submitted(self, event: Input.Submitted) -> None:
        self.dismiss(event.value.strip())


class Pick(_Dialog):
    """One of many, narrowed down by typing; what is typed counts where nothing matches."""

    BINDINGS: ClassVar[list[BindingType]] = [
        *LEAVE,
        Binding("down", "move(1)", "down", show=False),
        Binding("up", "move(-1)", "up", show=False),
    ]

    def __init__(
        self, title: str, hint: str, search: Callable[[str], Sequence[tuple[str, str]]]
    ) -> None:
        super().__init__()
        self.heading, self.hint, self.search = title, hint, search
        self.found: Sequence[tuple[str, str]] = ()

    def compose(self) -> ComposeResult:
        with Vertical(classes="box tall"):
            yield Label(self.heading, classes="heading")
            yield Input(placeholder=self.hint)
            yield OptionList()
            yield Label("Type to search, Enter takes, Escape leaves.", classes="dim")

    def on_mount(self) -> None:
        self._fill("")

    def on_input_changed(self, event: Input.Changed) -> None:
        self._fill(event.value)

    def _fill(self, text: str) -> None:
        self.found = self.search(text)
        options = self.query_one(OptionList)
        options.clear_options()
        options.add_options([shown for _, shown in self.found])
        if self.found:
            options.highlighted = 0

    def action_move(self, step: int) -> None:
        options = self.query_one(OptionList)
        if self.found:
            options.highlighted = ((options.highlighted or 0) + step) % len(self.found)

    def on_input_submitted(self, event: Input.Submitted) -> None:
        chosen = self.query_one(OptionList).highlighted
        if self.found and chosen is not None:
            self.dismiss(self.found[chosen][0])
        else:
            self.dismiss(event.value.strip() or None)

    def on_option_list_option_selected(self, event: OptionList.OptionSelected) -> None:
        self.dismiss(self.found[event.option_index][0])


class PickSeveral(ModalScreen[list[str] | None]):
    """Several of a tree, shown by indentation."""

    CSS_PATH = "dialogs.tcss"
    BINDINGS: ClassVar[list[BindingType]] = [
        *LEAVE,
        Binding("enter", "take", "take", show=False, priority=True),
    ]

    def __init__(
        self, title: str, entries: Sequence[tuple[str, str]], chosen: Sequence[str]
    ) -> None:
        super().__init__()
        self.heading, self.entries, self.chosen = title, entries, set(chosen)

    def compose(self) -> ComposeResult:
        with Vertical(classes="box tall"):
            yield Label(self.heading, classes="heading")
            yield SelectionList[str](
                *[Selection(shown, value, value in self.chosen) for value, shown in self.entries]
            )
            yield Label("Space chooses, Enter takes, Escape leaves.", classes="dim")

    def action_take(self) -> None:
        self.dismiss(list(self.query_one(SelectionList).selected))

    def action_leave(self) -> None:
        self.dismiss(None)


class Show(_Dialog):
    """Text to read."""

    BINDINGS: ClassVar[list[BindingType]] = [
        *LEAVE,
        Binding("enter,q", "leave", "leave", show=False),
    ]

    def __init__(self, title: str, text: str) -> None:
        super().__init__()
        self.heading, self.text = title, text

    def compose(self) -> ComposeResult:
        with VerticalScroll(classes="box tall"):
            yield Label(self.heading, classes="heading")
            yield Static(self.text, markup=False)
            yield Label("Escape leaves.", classes="dim")
