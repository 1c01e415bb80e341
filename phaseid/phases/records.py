"""One phase of a database, typed and validated."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property

from phaseid.phases.formula import Formula, parse

# Weight of a phase in a context by its abundance word; common practice.
ABUNDANCE: Mapping[str, float] = {"abundant": 1.0, "common": 0.3, "occasional": 0.1, "rare": 0.03}
# Weight of a phase that is not listed in the context: surprises happen. Common practice.
UNLISTED = 0.003

CRYSTAL_SYSTEMS = (
    "cubic",
    "tetragonal",
    "hexagonal",
    "trigonal",
    "orthorhombic",
    "monoclinic",
    "triclinic",
    "amorphous",
)


@dataclass(frozen=True)
class Phase:
    """A phase someone meets in a BSE image.

    Attributes
    ----------
    name : str
        The trade's or the approved mineral name; unique over all databases.
    formula : str
    source : str
        A published work, or "from memory".
    other_names : tuple of str
    ranges : dict of str to (float, float)
        Ranges of the formula's variables.
    density_range : (float, float) or None
        g/cm3, over the composition range.
    crystal_system : str or None
    contexts : dict of str to str
        Context path to abundance word.
    note : str or None
        Where grey is known to mislead.
    hazard : str or None
        One sentence of caution.
    database, location : str
        Where the entry stands: database name, and file with line.
    """

    name: str
    formula: str
    source: str
    other_names: tuple[str, ...] = ()
    ranges: Mapping[str, tuple[float, float]] = field(default_factory=dict)
    density_range: tuple[float, float] | None = None
    crystal_system: str | None = None
    contexts: Mapping[str, str] = field(default_factory=dict)
    note: str | None = None
    hazard: str | None = None
    database: str = ""
    location: str = ""

    @cached_property
    def parsed(self) -> Formula:
        """The formula, read.

        Raises
        ------
        FormulaError
        """
        return parse(self.formula, self.ranges)

    @property
    def density(self) -> float | None:
        """Density in the middle of its range, g/cm3."""
        if self.density_range is None:
            return None
        return round(sum(self.density_range) / 2, 6)

    @property
    def names(self) -> tuple[str, ...]:
        """Name and other names."""
        return (self.name, *self.other_names)
