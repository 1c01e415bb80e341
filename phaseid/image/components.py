"""The mixture behind the clusters, fitted to the histogram of all pixels."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from phaseid.image.clusters import Cluster, Components
from phaseid.image.mixture import GreyMixture
from phaseid.image.noise import NoiseLaw

MOST_BINS = 1024
ITERATIONS = 40
# Where phases are buried in each other's noise the histogram cannot hold the means apart; then the
# components are those that the labels give.
FARTHEST = 0.5


def fit_components(
    histogram: tuple[NDArray[np.float64], NDArray[np.int64]],
    clusters: Sequence[Cluster],
    noise: NoiseLaw,
    ends: tuple[float | None, float | None],
) -> Components:
    """Fit one component per cluster, starting from the clusters.

    Parameters
    ----------
    histogram : (values, counts)
    clusters : sequence of Cluster
    noise : NoiseLaw
    ends : (float or None, float or None)
        Greys at which the range is cut off.

    Returns
    -------
    Components
    """
    means = np.array([c.grey_mean for c in clusters])
    given = Components(
        np.array([c.area_fraction for c in clusters]),
        means,
        np.array([c.grey_sd for c in clusters]),
    )
    values, counts = _rebinned(*histogram)
    if len(values) < 3 or len(clusters) == 0:
        return given
    width = float(values[1] - values[0])
    model = GreyMixture(
        len(clusters),
        noise=noise.pair,
        spread="floor",
        bin_width=width,
        limits=ends,
        means_init=means,
        max_iter=ITERATIONS,
        reg_covar=max(noise.floor, 1e-12),
    ).fit(values, sample_weight=counts)
    fitted = model.means_[:, 0]
    allowed = FARTHEST * np.maximum(noise.sd(means), given.sds)
    if np.any(np.abs(fitted - means) > allowed):
        return given
    return Components(model.weights_, fitted, np.sqrt(model.covariances_[:, 0, 0]))


def _rebinned(
    values: NDArray[np.float64], counts: NDArray[np.int64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    merged = int(np.ceil(len(values) / MOST_BINS))
    if merged <= 1:
        return values, counts.astype(float)
    pad = -len(values) % merged
    step = float(values[1] - values[0])
    summed = np.pad(counts, (0, pad)).reshape(-1, merged).sum(axis=1).astype(float)
    centres = values[0] + step * (np.arange(len(summed)) * merged + (merged - 1) / 2)
    return centres, summed
