"""The result of an analysis, as plain data that reports and screens can show."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from phaseid.inference.advice import Measure
from phaseid.inference.ranking import Ranking
from phaseid.physics.conditions import Conditions


@dataclass(frozen=True)
class Notice:
    """A warning: a stable code, one sentence, and what to do about it."""

    code: str
    message: str
    remedy: str = ""


@dataclass(frozen=True)
class Candidate:
    """One phase a cluster can be.

    Attributes
    ----------
    phase : int
        Index in the knowledge's table.
    predicted_grey, predicted_grey_sd : float
        NaN where the grey scale is not known at all.
    probability : float
    group : int
        Candidates of one group cannot be told apart by grey.
    """

    phase: int
    name: str
    formula: str
    database: str
    mean_atomic_number: float
    eta: float
    signal: float
    predicted_grey: float
    predicted_grey_sd: float
    probability: float
    group: int
    hazard: str | None
    note: str | None
    listed: bool = False


@dataclass(frozen=True)
class ClusterAnswer:
    """One cluster and what it can be.

    Attributes
    ----------
    image, id : int
        Index of the image and the cluster's label in its label map.
    observation : int or None
        Row in the ranking; None for a cluster that is left out.
    probability_vector index is `observation`.
    """

    image: int
    id: int
    name: str
    grey_mean: float
    grey_se: float
    grey_sd: float
    clipped: str | None
    area_fraction: float
    pixels: int
    regions: int
    observation: int | None
    none_of_these: float
    candidates: tuple[Candidate, ...]
    resolution: float
    known: str | None = None
    accepted: str | None = None
    seen: tuple[str, ...] = ()
    unseen: tuple[str, ...] = ()
    remarks: tuple[str, ...] = ()


@dataclass(frozen=True)
class ScaleAnswer:
    """The grey scale: grey = offset + gain * signal, and what it rests on."""

    offset: float
    gain: float
    offset_se: float
    gain_se: float
    references: tuple[str, ...]


@dataclass(frozen=True)
class Analysis:
    """Everything one ranking says about one image, or about a series that shares a grey scale.

    Attributes
    ----------
    images : tuple of int
        Indices of the session's images it covers.
    conditions : Conditions
    contexts : tuple of str
    clusters : tuple of ClusterAnswer
        All clusters of all its images, ascending grey within an image.
    scale : ScaleAnswer or None
        None where nothing fixes it (a single cluster without any reference).
    advice : tuple of Measure
        `Measure.cluster` is an index into `clusters`.
    notices : tuple of Notice
    ranking : Ranking
    drift : ndarray of shape (images, 2)
        Gain factor and offset of each image relative to the common grey scale.
    """

    images: tuple[int, ...]
    conditions: Conditions
    contexts: tuple[str, ...]
    clusters: tuple[ClusterAnswer, ...]
    scale: ScaleAnswer | None
    advice: tuple[Measure, ...]
    notices: tuple[Notice, ...]
    ranking: Ranking | None
    drift: NDArray[np.float64]

    def of_image(self, image: int) -> tuple[ClusterAnswer, ...]:
        """Clusters of one image."""
        return tuple(c for c in self.clusters if c.image == image)
