"""What the user has said so far, as plain immutable data."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import asdict, dataclass, field, fields, replace
from typing import Any, Literal, get_args

from phaseid.errors import InputError

SCHEMA = "phaseid-session/1"

MarkKind = Literal[
    "known",
    "standard",
    "dark",
    "seen",
    "unseen",
    "content",
    "rejected",
    "accepted",
    "named",
    "ignored",
    "listed",
]
EditKind = Literal["count", "merge", "split", "boundary", "rectangle", "polygon", "mask"]


@dataclass(frozen=True)
class Mark:
    """One thing said about a grey of an image.

    Attributes
    ----------
    kind : str
        "known" (this cluster is phase `value`), "standard" (a standard of formula `value` imaged at the
        same settings), "dark" (no signal), "seen" / "unseen" (X-ray elements in `value`, separated by
        commas), "content" (mass per cent in `value`, ``Fe=60,O=30``), "rejected" / "accepted" (candidate `value`, reason or note in `note`), "named" (what
        to call the cluster), "ignored" (leave the cluster out), "listed" (show phase `value` always).
    grey : float
        The cluster is the one nearest this grey.
    value, note : str
    image : int
        Index of the image.
    """

    kind: MarkKind
    grey: float
    value: str = ""
    note: str = ""
    image: int = 0


@dataclass(frozen=True)
class Edit:
    """One change the user made to the clusters of an image.

    Attributes
    ----------
    kind : str
        "count" (force the number), "merge" (the clusters nearest the greys in `numbers`), "split" (the
        cluster nearest the first number into the second number of parts), "boundary" (between the
        clusters nearest the first two greys, at the third), "rectangle" (row, column, height, width),
        "polygon" (rows and columns in turn), "mask" (an image file in `path`): areas left out.
    numbers : tuple of float
    path : str
    image : int
    """

    kind: EditKind
    numbers: tuple[float, ...] = ()
    path: str = ""
    image: int = 0


@dataclass(frozen=True)
class ImageRef:
    """An image of the session and the hash it had when it was first read."""

    path: str
    sha256: str = ""
    page: int | None = None


@dataclass(frozen=True)
class State:
    """Everything a result depends on, besides the databases and the plugins.

    Attributes
    ----------
    images : tuple of ImageRef
    energy_keV, tilt_deg : float or None
        None takes the value from the image's metadata.
    coat : str or None
        MATERIAL:NM.
    detector : str or None
        KIND or KIND:THRESHOLD_KEV.
    model, rule : str or None
        Names of the backscatter model and the compound rule; None takes the default.
    contexts : tuple of str
    databases : tuple of str
        Database files beside those that ship.
    marks, edits : tuple
    same_settings : bool
        The images share one grey scale.
    none_weight : float
        Prior probability of "none of these".
    distinct : bool
        Two clusters are not the same phase of fixed composition.
    site_knowledge : bool
        Weigh candidates by this laboratory's accepted identifications.
    """

    images: tuple[ImageRef, ...] = ()
    energy_keV: float | None = None
    tilt_deg: float | None = None
    coat: str | None = None
    detector: str | None = None
    model: str | None = None
    rule: str | None = None
    contexts: tuple[str, ...] = ()
    databases: tuple[str, ...] = ()
    marks: tuple[Mark, ...] = ()
    edits: tuple[Edit, ...] = ()
    same_settings: bool = False
    none_weight: float = 0.05
    distinct: bool = True
    site_knowledge: bool = False

    def marked(self, kind: MarkKind, image: int | None = None) -> tuple[Mark, ...]:
        """Marks of one kind, of one image if given."""
        return tuple(
            m for m in self.marks if m.kind == kind and (image is None or m.image == image)
        )

    def with_mark(self, mark: Mark) -> State:
        """Add a mark."""
        return replace(self, marks=(*self.marks, mark))

    def without_mark(self, mark: Mark) -> State:
        """Take a mark back."""
        return replace(self, marks=tuple(m for m in self.marks if m != mark))


@dataclass(frozen=True)
class Step:
    """One entry of the history: what was done, and the state before it."""

    label: str
    before: State


@dataclass(frozen=True)
class History:
    """States to go back and forward to."""

    past: tuple[Step, ...] = ()
    future: tuple[Step, ...] = field(default=())


def to_json(state: State) -> dict[str, Any]:
    """Plain data of a state."""
    return asdict(state)


def from_json(data: object, where: str) -> State:
    """Read a state back, refusing what does not belong.

    Parameters
    ----------
    data : object
        Parsed JSON.
    where : str
        Name of the file, for the message.

    Returns
    -------
    State

    Raises
    ------
    InputError
        If a field is missing, unknown or of the wrong type.
    """
    values = _checked(data, State, where, "state")
    values["images"] = tuple(
        ImageRef(**_checked(v, ImageRef, where, "images")) for v in _items(values, "images", where)
    )
    marks = []
    for v in _items(values, "marks", where):
        mark = Mark(**_checked(v, Mark, where, "marks"))
        if mark.kind not in get_args(MarkKind):
            raise InputError(
                f"{where}: unknown kind of mark {mark.kind!r}; remove it from the file."
            )
        marks.append(mark)
    edits = []
    for v in _items(values, "edits", where):
        fields_ = _checked(v, Edit, where, "edits")
        fields_["numbers"] = tuple(float(n) for n in fields_.get("numbers", ()))
        edit = Edit(**fields_)
        if edit.kind not in get_args(EditKind):
            raise InputError(
                f"{where}: unknown kind of edit {edit.kind!r}; remove it from the file."
            )
        edits.append(edit)
    values["marks"], values["edits"] = tuple(marks), tuple(edits)
    for name in ("contexts", "databases"):
        values[name] = tuple(str(v) for v in _items(values, name, where))
    return State(**values)


def _items(values: Mapping[str, Any], name: str, where: str) -> list[Any]:
    found = values.get(name, [])
    if not isinstance(found, list | tuple):
        raise InputError(f"{where}: field {name!r} must be a list; restore the file from a copy.")
    return list(found)


_PLAIN: Mapping[str, tuple[type, ...]] = {
    "str": (str,),
    "str | None": (str, type(None)),
    "float": (int, float),
    "float | None": (int, float, type(None)),
    "int": (int,),
    "int | None": (int, type(None)),
    "bool": (bool,),
    "MarkKind": (str,),
    "EditKind": (str,),
}


def _checked(data: object, kind: type[Any], where: str, name: str) -> dict[str, Any]:
    if not isinstance(data, dict):
        raise InputError(f"{where}: {name!r} must hold named fields; restore the file from a copy.")
    known = {f.name: str(f.type) for f in fields(kind)}
    unknown = sorted(set(data) - set(known))
    if unknown:
        raise InputError(
            f"{where}: unknown field {unknown[0]!r} in {name!r}; it was written by a newer version or "
            "edited by hand: update phaseid or remove the field."
        )
    for field_name, value in data.items():
        allowed = _PLAIN.get(known[field_name])
        wrong_bool = isinstance(value, bool) and allowed is not None and bool not in allowed
        if allowed is not None and (not isinstance(value, allowed) or wrong_bool):
            raise InputError(
                f"{where}: field {field_name!r} in {name!r} must be {known[field_name]}, "
                f"not {value!r}; correct it or restore the file from a copy."
            )
    return dict(data)
