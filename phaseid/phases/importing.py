"""A laboratory's own phases from a spreadsheet: looked at first, written only when clean."""

from __future__ import annotations

import csv
import io
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

from phaseid.errors import InputError
from phaseid.phases.catalogue import Catalogue, fold
from phaseid.phases.checks import check_entries
from phaseid.phases.contexts import ContextTree
from phaseid.phases.formula import parse
from phaseid.phases.records import ABUNDANCE, CRYSTAL_SYSTEMS, Phase

# Headings that are understood, in the spelling of the database file and in the usual words.
HEADINGS: Mapping[str, tuple[str, ...]] = {
    "name": ("name", "phase", "mineral", "constituent"),
    "formula": ("formula", "composition", "chemistry"),
    "other_names": ("other_names", "other names", "synonyms", "aliases"),
    "ranges": ("ranges", "range", "limits"),
    "density": ("density", "rho", "g/cm3", "density (g/cm3)", "density g/cm3"),
    "crystal_system": ("crystal_system", "crystal system", "system"),
    "contexts": ("contexts", "context"),
    "note": ("note", "notes", "remark"),
    "hazard": ("hazard", "caution"),
    "source": ("source", "reference"),
}
DEFAULT_CONTEXT = "preparation"
MOST_ROWS = 20_000
MOST_COLUMNS = 60
LARGEST_BYTES = 20_000_000


@dataclass(frozen=True)
class Refused:
    """A row that cannot be taken: its number in the sheet (the heading is 1) and why."""

    row: int
    name: str
    reason: str


@dataclass(frozen=True)
class Preview:
    """What an import would do.

    Attributes
    ----------
    phases : tuple of Phase
        Rows that are clean.
    refused : tuple of Refused
    replaces : tuple of str
        Names that are already in the catalogue; the new entries would take their place.
    doubts : tuple of str
        What the checks find in the clean rows: charges, densities, missing hazards; to look at, but
        no reason to refuse.
    """

    phases: tuple[Phase, ...]
    refused: tuple[Refused, ...]
    replaces: tuple[str, ...]
    doubts: tuple[str, ...] = ()


def read_sheet(path: Path) -> list[dict[str, str]]:
    """Rows of a CSV or XLSX file by heading.

    Raises
    ------
    InputError
        If the file cannot be read or has no heading that is understood.
    """
    if not path.is_file():
        raise InputError(f"{path} is no file; give a CSV or XLSX file.")
    rows = _xlsx(path) if path.suffix.casefold() in (".xlsx", ".xlsm") else _csv(path)
    if not rows:
        raise InputError(
            f"{path} is empty; the first row must hold headings such as name, formula."
        )
    if len(rows) > MOST_ROWS:
        raise InputError(f"{path} has {len(rows)} rows; {MOST_ROWS} are the most in one import.")
    headings = [_heading(cell) for cell in rows[0]]
    for wanted in ("name", "formula"):
        if wanted not in headings:
            raise InputError(
                f"{path} has no column {wanted!r}; the headings are {', '.join(rows[0])}: rename one."
            )
    return [
        {h: cell.strip() for h, cell in zip(headings, row, strict=False) if h and cell.strip()}
        for row in rows[1:]
    ]


def preview(
    rows: Sequence[Mapping[str, str]], catalogue: Catalogue, contexts: ContextTree, database: str
) -> Preview:
    """Validate rows without writing anything.

    Parameters
    ----------
    rows : sequence of mapping
        As from `read_sheet`.
    catalogue : Catalogue
    contexts : ContextTree
    database : str
        Name of the database they go into.

    Returns
    -------
    Preview
    """
    phases: list[Phase] = []
    refused: list[Refused] = []
    replaces: list[str] = []
    names: set[str] = set()
    for number, row in enumerate(rows, start=2):
        if not row:
            continue
        try:
            phase = _phase(row, contexts, database)
            if fold(phase.name) in names:
                raise InputError("the name stands twice in the sheet; rename one")
        except InputError as error:
            refused.append(Refused(number, row.get("name", ""), str(error).rstrip(".")))
            continue
        names.add(fold(phase.name))
        phases.append(phase)
        position = catalogue.index(phase.name)
        if position is not None and fold(catalogue.phases[position].name) == fold(phase.name):
            replaces.append(phase.name)
    doubts = [f"{f.phase}: {f.message}" for f in check_entries(phases, contexts)]
    return Preview(tuple(phases), tuple(refused), tuple(replaces), tuple(doubts))


def _phase(row: Mapping[str, str], contexts: ContextTree, database: str) -> Phase:
    for wanted in ("name", "formula"):
        if not row.get(wanted):
            raise InputError(f"the {wanted} is missing; fill it in")
    ranges = _ranges(row.get("ranges", ""))
    parse(row["formula"], ranges)
    system = row.get("crystal_system", "").casefold() or None
    if system is not None and system not in CRYSTAL_SYSTEMS:
        raise InputError(
            f"the crystal system {system!r} is not one of {', '.join(CRYSTAL_SYSTEMS)}"
        )
    return Phase(
        name=row["name"],
        formula=row["formula"],
        source=row.get("source", "the laboratory's own list"),
        other_names=tuple(n.strip() for n in row.get("other_names", "").split(";") if n.strip()),
        ranges=ranges,
        density_range=_density(row.get("density", "")),
        crystal_system=system,
        contexts=_contexts(row.get("contexts", ""), contexts),
        note=row.get("note"),
        hazard=row.get("hazard"),
        database=database,
    )


def _ranges(text: str) -> dict[str, tuple[float, float]]:
    found: dict[str, tuple[float, float]] = {}
    for part in text.split(";"):
        if not part.strip():
            continue
        name, _, ends = part.replace("=", ":").partition(":")
        numbers = ends.replace("..", " ").replace("-", " ").replace(",", " ").split()
        try:
            low, high = (float(n) for n in numbers)
        except ValueError:
            raise InputError(f"the range {part.strip()!r} is not of the form x: 0-0.2") from None
        found[name.strip()] = (low, high)
    return found


def _density(text: str) -> tuple[float, float] | None:
    if not text:
        return None
    parts = text.replace(",", ".").replace("–", "-").split("-")
    try:
        numbers = sorted(float(p) for p in parts)
    except ValueError:
        raise InputError(f"the density {text!r} is no number of g/cm3") from None
    if not 1 <= len(numbers) <= 2 or not 0.01 <= numbers[0] <= numbers[-1] <= 30:
        raise InputError(f"the density {text!r} is none of a solid; give it in g/cm3")
    return numbers[0], numbers[-1]


def _contexts(text: str, contexts: ContextTree) -> dict[str, str]:
    found: dict[str, str] = {}
    for part in text.replace(",", ";").split(";"):
        if not part.strip():
            continue
        name, _, word = part.partition(":")
        word = word.strip() or "common"
        if word not in ABUNDANCE:
            raise InputError(f"the abundance {word!r} is not one of {', '.join(ABUNDANCE)}")
        found[contexts.resolve(name).path] = word
    return found or {DEFAULT_CONTEXT: "occasional"}


def _heading(cell: str) -> str:
    spelled = " ".join(cell.casefold().split())
    for name, spellings in HEADINGS.items():
        if spelled in spellings:
            return name
    return ""


def _csv(path: Path) -> list[list[str]]:
    _not_too_large(path)
    try:
        text = path.read_text(encoding="utf-8-sig")
    except UnicodeDecodeError:
        text = path.read_text(encoding="cp1252", errors="replace")
    except OSError as error:
        raise InputError(f"Cannot read {path}: {error.strerror or error}.") from None
    if "\0" in text:
        raise InputError(f"{path} is not a text file; save the sheet as CSV or XLSX.")
    first = text.split("\n", 1)[0]
    separator = max(",;\t", key=first.count)
    try:
        return [row for row in csv.reader(io.StringIO(text), delimiter=separator) if any(row)]
    except csv.Error as error:
        raise InputError(f"{path} is no CSV file ({error}); save the sheet again.") from None


def _not_too_large(path: Path) -> None:
    if path.stat().st_size > LARGEST_BYTES:
        raise InputError(f"{path} is larger than {LARGEST_BYTES // 1_000_000} MB; split the sheet.")


def _xlsx(path: Path) -> list[list[str]]:
    try:
        import openpyxl
    except ImportError:
        raise InputError(
            "Reading XLSX needs openpyxl; install it with: pip install 'phaseid[spreadsheet]', or save "
            "the sheet as CSV."
        ) from None
    _not_too_large(path)
    try:
        book = openpyxl.load_workbook(path, read_only=True, data_only=True)
        # A small compressed file may hold any number of rows and columns.
        sheet = book.worksheets[0].iter_rows(
            values_only=True, max_row=MOST_ROWS + 2, max_col=MOST_COLUMNS
        )
        rows = [["" if cell is None else str(cell) for cell in row] for row in sheet]
        book.close()
    except Exception:
        raise InputError(f"{path} is not a readable XLSX file; save it again or as CSV.") from None
    return [row for row in rows if any(row)]
