"""What plugins say about the images of an analysis, folded into the evidence about its clusters."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from phaseid.hooks.specs import ClusterSummary
from phaseid.image.clusters import Cluster
from phaseid.session.candidates import Candidates
from phaseid.session.knowledge import Knowledge
from phaseid.session.state import State

Floats = NDArray[np.float64]


def summary(cluster: Cluster) -> ClusterSummary:
    """A cluster as plugins see it."""
    return ClusterSummary(
        cluster.grey_mean,
        cluster.grey_se,
        cluster.grey_sd,
        cluster.area_fraction,
        cluster.pixels,
        cluster.regions,
        cluster.clipped,
    )


def plugin_evidence(
    state: State,
    knowledge: Knowledge,
    candidates: Candidates,
    images: Sequence[tuple[int, Sequence[Cluster], Sequence[int]]],
    count: int,
) -> Floats:
    """Factors of plugins' extra evidence.

    Parameters
    ----------
    state : State
    knowledge : Knowledge
    candidates : Candidates
        P phases in R rows.
    images : sequence of (image, clusters, observations)
        Index of the image in the state, its clusters, and the row of the ranking of each.
    count : int
        K rows of the ranking.

    Returns
    -------
    ndarray of shape (K, R)
    """
    factors = np.ones((count, candidates.set.size))
    for image, clusters, observations in images:
        ref = state.images[image]
        told = {
            "path": ref.path,
            "sha256": ref.sha256,
            "energy_keV": candidates.conditions.energy_keV,
            "tilt_deg": candidates.conditions.tilt_deg,
        }
        found = knowledge.image_factors(
            state.contexts, candidates, [summary(c) for c in clusters], told
        )
        for row, observation in zip(found, observations, strict=True):
            factors[observation] *= row
    return factors[:, candidates.set.phase]
