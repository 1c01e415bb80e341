"""Clusters of grey and the regions they are made of, as plain data."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal

import numpy as np
from numpy.typing import NDArray

Kind = Literal["phase", "void"]

# One row per connected region of one cluster.
REGION_FIELDS = np.dtype(
    [
        ("region", np.int32),
        ("cluster", np.uint8),
        ("pixels", np.int64),
        ("area_um2", np.float64),
        ("equivalent_diameter_px", np.float64),
        ("equivalent_diameter_um", np.float64),
        ("row", np.float64),
        ("column", np.float64),
        ("grey_mean", np.float64),
        ("grey_se", np.float64),
        ("interior_pixels", np.int64),
        ("edge_share", np.float64),
        ("touches_frame", np.bool_),
        ("elongation", np.float64),
        ("angle_deg", np.float64),
        ("first_row", np.int32),
        ("first_column", np.int32),
        ("height", np.int32),
        ("width", np.int32),
    ]
)


@dataclass(frozen=True)
class Cluster:
    """One grey that covers part of the image.

    Attributes
    ----------
    id : int
        Value in the label map, 1 for the darkest.
    grey_mean, grey_se : float
        Mean grey of the interior and its standard error; of a clipped cluster only a bound.
    grey_sd : float
        Standard deviation of the interior pixels.
    clipped : {None, "low", "high"}
        End of the grey range at which greys of this cluster are cut off.
    area_fraction : float
        Share of the image (bar and excluded areas not counted).
    pixels, regions : int
    kind : {"phase", "void"}
        "void" for what looks like pores, cracks or mounting medium.
    weight, component_sd : float
        Of the component of the fitted mixture.
    interior_pixels : int
        Pixels the mean rests on.
    notes : tuple of str
        What limits it: zoned, channelling, specks too small, and the like.
    """

    id: int
    grey_mean: float
    grey_se: float
    grey_sd: float
    clipped: Literal["low", "high"] | None
    area_fraction: float
    pixels: int
    regions: int
    kind: Kind = "phase"
    weight: float = 0.0
    component_sd: float = 0.0
    interior_pixels: int = 0
    notes: tuple[str, ...] = ()


@dataclass(frozen=True)
class Components:
    """Parameters of the fitted mixture, ascending means."""

    weights: NDArray[np.float64] = field(default_factory=lambda: np.zeros(0))
    means: NDArray[np.float64] = field(default_factory=lambda: np.zeros(0))
    sds: NDArray[np.float64] = field(default_factory=lambda: np.zeros(0))
