"""The hooks. Each is called as its docstring says; results do not depend on the order of plugins."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from phaseid.hooks.markers import hookspec

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from phaseid.phases.contexts import Coexistence, Context
    from phaseid.phases.records import Phase
    from phaseid.physics.conditions import Conditions
    from phaseid.physics.elemental import BackscatterModel


@dataclass(frozen=True)
class ClusterSummary:
    """One cluster of grey of an image.

    Attributes
    ----------
    grey_mean, grey_se, grey_sd : float
        Mean, its standard error, and the spread of the pixels; raw grey of the image.
    area_fraction : float
    pixels, regions : int
        Pixels in all, and connected regions.
    clipped : {"low", "high"} or None
        At which end of the range the grey is cut off.
    """

    grey_mean: float
    grey_se: float
    grey_sd: float
    area_fraction: float
    pixels: int
    regions: int
    clipped: str | None = None


@dataclass(frozen=True)
class Situation:
    """What a hook may look at, and not change. Fields are only ever added.

    Attributes
    ----------
    conditions : Conditions
    contexts : tuple of str
        Full paths of the contexts the user has chosen.
    phases : tuple of Phase
        P candidates; arrays that hooks give back follow this order.
    mean_atomic_number, eta, signal : ndarray of shape (P,)
        Read-only.
    clusters : tuple of ClusterSummary
        Clusters of the image, ascending in grey, where the hook is called for one image; else empty.
    """

    conditions: Conditions
    contexts: tuple[str, ...]
    phases: Sequence[Phase]
    mean_atomic_number: NDArray[np.float64]
    eta: NDArray[np.float64]
    signal: NDArray[np.float64]
    clusters: tuple[ClusterSummary, ...] = ()

    def __post_init__(self) -> None:
        # A plugin that writes into an array would change the answers of all the others.
        for name in ("mean_atomic_number", "eta", "signal"):
            view = getattr(self, name).view()
            view.flags.writeable = False
            object.__setattr__(self, name, view)


@dataclass(frozen=True)
class ReportSection:
    """A section a plugin adds to a report: a title and paragraphs of plain text."""

    title: str
    paragraphs: tuple[str, ...]


@hookspec
def register_databases() -> Sequence[Path] | None:
    """Paths of database files to add.

    Called once, when the databases are loaded. A phase of the same name as one that ships replaces it;
    a faulty file is named and left out. None adds none. Since 0.1.
    """


@hookspec
def register_contexts() -> Sequence[Context] | None:
    """Contexts to add to the tree.

    Called once, when the contexts are loaded. A path that ships, or that a plugin earlier in the
    alphabet defines, stays as it is. None adds none. Since 0.1.
    """


@hookspec
def register_backscatter_models() -> Sequence[BackscatterModel] | None:
    """Formulas for eta of the elements that the user can choose by name.

    Called once, when the command starts. They do not enter the spread between models. None adds none.
    Since 0.1.
    """


@hookspec
def filter_candidates(situation: Situation) -> NDArray[np.bool_] | None:
    """Which phases are possible at all, shape (P,).

    Called for every ranking that has a context. A phase that any plugin excludes is excluded. None
    excludes nothing. Since 0.1.
    """


@hookspec
def weigh_candidates(situation: Situation) -> NDArray[np.float64] | None:
    """Factors on the weights of the phases, shape (P,); 1 leaves a phase as it is.

    Called for every ranking. The factors of all plugins multiply. None changes nothing. Since 0.1.
    """


@hookspec
def register_coexistence() -> Sequence[Coexistence] | None:
    """Phases that do not occur together.

    Called for every ranking; a rule holds in the contexts it names. Names that no database has are passed over. None adds
    none. Since 0.1.
    """


@hookspec
def gather_evidence(
    situation: Situation, image: Mapping[str, Any]
) -> Mapping[str, float | Sequence[float]] | None:
    """Extra evidence about an image: phase names and likelihood factors.

    Called for every image of a ranking; `image` holds ``path``, ``sha256``, ``energy_keV`` and
    ``tilt_deg``, `situation.clusters` its clusters that take part. A single factor acts on all
    clusters, a sequence holds one for each. The factors of all plugins multiply; names that no database
    has are passed over. None adds none. Since 0.1.
    """


@hookspec
def report_sections(document: Mapping[str, Any]) -> Sequence[ReportSection] | None:
    """Sections to add to a report; `document` is the candidates document.

    Called once per report. None adds none. Since 0.1.
    """
