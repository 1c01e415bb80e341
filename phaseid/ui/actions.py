"""Everything one can do, in one table: it drives keys, footer, command palette and help."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from phaseid.errors import InputError


@dataclass(frozen=True)
class Action:
    """One thing the user can do.

    Attributes
    ----------
    name : str
        Stable; the screen has a method ``action_<name>``; keys are remapped by it.
    key : str
    label : str
        For the footer and the palette.
    help : str
        One sentence.
    footer : bool
    """

    name: str
    key: str
    label: str
    help: str
    footer: bool = False


ACTIONS: tuple[Action, ...] = (
    Action("know", "k", "known phase", "Say that the selected cluster is a phase you know.", True),
    Action("forget", "K", "forget known", "Take back what was said about the selected cluster."),
    Action("seen", "x", "X-ray seen", "Give elements an X-ray spectrum of the cluster shows.", True),
    Action("unseen", "X", "X-ray not seen", "Give elements that were looked for and not found."),
    Action("content", "y", "content", "Give a quick quantification of the cluster in mass per cent."),
    Action("standard", "s", "standard", "Give a standard imaged at the same settings: GREY=FORMULA."),
    Action("dark", "d", "dark level", "Give the grey with no beam."),
    Action("context", "c", "context", "Choose what the sample is; several at once.", True),
    Action("conditions", "e", "conditions", "Set beam energy, tilt, coat and detector."),
    Action("model", "m", "eta model", "Switch the backscatter model and see what it changes."),
    Action("accept", "a", "accept", "Accept the selected candidate, with a note."),
    Action("reject", "r", "reject", "Reject the selected candidate, with a reason."),
    Action("list", "l", "add phase", "Search all databases and add a phase to the cluster's list."),
    Action("compare", "v", "compare", "Compare the selected candidate with another: what speaks for which."),
    Action("explain", "w", "why", "Why the selected candidate has its probability."),
    Action("merge", "g", "merge", "Merge the selected cluster with another."),
    Action("split", "t", "split", "Split the selected cluster."),
    Action("boundary", "b", "boundary", "Move the boundary between two clusters to a grey."),
    Action("rename", "n", "rename", "Name the selected cluster."),
    Action("leave_out", "o", "leave out", "Leave the selected cluster out, or take it in again."),
    Action("count", "N", "number", "Force the number of clusters; empty lets the tool choose."),
    Action("area", "z", "exclude area", "Exclude a rectangle: mark one corner, move, press again."),
    Action("same", "S", "same settings", "The images of the session share one grey scale, or not."),
    Action("next_image", "i", "next image", "Show the next image of the session."),
    Action("site", "L", "site knowledge", "Use what this laboratory accepted before, or not."),
    Action("find", "f", "read point", "Select the cluster under the cursor."),
    Action("zoom_in", "plus", "nearer", "Zoom into the picture."),
    Action("zoom_out", "minus", "farther", "Zoom out of the picture."),
    Action("notices", "f2", "notices", "Warnings of the image and what to do about each."),
    Action("advice", "f3", "what next", "All measurements worth making, with their expected bits."),
    Action("export", "p", "write files", "Write the candidates document, tables, labels and figure.", True),
    Action("undo", "u", "undo", "Take the last action back.", True),
    Action("redo", "U", "redo", "Do again what was undone."),
    Action("stop", "escape", "stop", "Stop the work in progress; once more begins it again."),
    Action("help", "question_mark", "help", "What the keys do.", True),
    Action("quit", "q", "quit", "Leave; everything is saved.", True),
)  # fmt: skip

HINT = (
    "Up and down choose a cluster, Tab goes to its candidates, the arrows move in the picture.",
    "k says which phase a cluster is; two known phases fix the grey scale, and every list shrinks.",
    "c says what the sample is; x gives elements an X-ray spectrum showed.",
    "F3 says what to measure next; a and r accept and reject; u takes anything back.",
    "Everything is saved as you go; p writes the files, ? lists all keys, q leaves.",
)


def keys_file() -> Path:
    """Where keys are remapped: lines ``name = key``."""
    import platformdirs

    return platformdirs.user_config_path("phaseid") / "keys.txt"


def remapped(path: Path | None = None) -> tuple[Action, ...]:
    """The actions with the user's keys.

    Raises
    ------
    InputError
        If the file names an action that does not exist, or gives one key twice.
    """
    from dataclasses import replace

    path = path or keys_file()
    if not path.is_file():
        return ACTIONS
    told: dict[str, str] = {}
    known = {a.name for a in ACTIONS}
    for number, line in enumerate(path.read_text(encoding="utf-8").splitlines(), start=1):
        text = line.split("#")[0].strip()
        if not text:
            continue
        name, found, key = (part.strip() for part in text.partition("="))
        if not found or name not in known or not key:
            raise InputError(
                f"{path}, line {number}: {text!r} is not 'action = key'; actions are "
                f"{', '.join(sorted(known))}."
            )
        told[name] = key
    actions = tuple(replace(a, key=told.get(a.name, a.key)) for a in ACTIONS)
    keys = [a.key for a in actions]
    twice = sorted({k for k in keys if keys.count(k) > 1})
    if twice:
        raise InputError(f"{path}: the key {twice[0]!r} is given to two actions; change one.")
    return actions
