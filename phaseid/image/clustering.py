"""From a grey image to clusters of grey."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from phaseid.errors import InputError
from phaseid.image import editing
from phaseid.image.areas import Area, mask_of
from phaseid.image.clusters import Cluster, Components
from phaseid.image.greyimage import GreyImage
from phaseid.image.infobar import used_rows
from phaseid.image.measuring import measure
from phaseid.image.mixture import GreyMixture
from phaseid.image.noise import NoiseLaw, estimate_noise
from phaseid.image.notices import Finding

__all__ = ["Cluster", "Clustering", "cluster_image"]

Progress = Callable[[float, str], None]


@dataclass(frozen=True, eq=False)
class Clustering:
    """Clusters of one image.

    Attributes
    ----------
    clusters : tuple of Cluster
        Ascending grey.
    labels : ndarray of uint8, shape (rows, columns)
        Id of the cluster of each pixel; 0 for the bar and excluded areas.
    edge : ndarray of bool, shape (rows, columns)
        Pixels near a border, which do not enter the means.
    histogram : (values, counts)
        Of all pixels that are labelled.
    mixture : Components
    noise : NoiseLaw
    warnings : tuple of Finding
    region_table : ndarray of REGION_FIELDS
    crop : (first row, end row, first column, end column)
    """

    clusters: tuple[Cluster, ...]
    labels: NDArray[np.uint8]
    edge: NDArray[np.bool_]
    histogram: tuple[NDArray[np.float64], NDArray[np.int64]]
    mixture: Components
    noise: NoiseLaw
    warnings: tuple[Finding, ...]
    region_table: NDArray[Any]
    crop: tuple[int, int, int, int]
    image: GreyImage

    @property
    def phases(self) -> tuple[Cluster, ...]:
        """Clusters that are not pores, cracks or mounting medium."""
        return tuple(c for c in self.clusters if c.kind == "phase")

    def nearest(self, grey: float) -> Cluster:
        """Cluster whose mean is nearest a grey."""
        return min(self.clusters, key=lambda c: abs(c.grey_mean - grey))

    def merge(self, ids: Sequence[int]) -> Clustering:
        """Make one cluster of several."""
        return self._with(editing.merged(self.labels, ids, self._ids()))

    def split(self, id: int, parts: int = 2) -> Clustering:
        """Divide a cluster by grey into `parts`."""
        return self._with(editing.split(self.labels, self._smooth(), id, parts, self._ids()))

    def move_boundary(self, a: int, b: int, grey: float) -> Clustering:
        """Divide the pixels of two clusters anew at a grey (of the locally averaged image)."""
        mean = {c.id: c.grey_mean for c in self.clusters}
        if a in mean and b in mean and mean[a] > mean[b]:
            a, b = b, a
        return self._with(
            editing.boundary_moved(self.labels, self._smooth(), a, b, grey, self._ids())
        )

    def exclude(self, *areas: Area | NDArray[Any]) -> Clustering:
        """Leave areas out; the clusters are measured on what remains."""
        outside = mask_of(areas, self.labels.shape)
        if outside is None:
            return self
        return self._with(np.where(outside, np.uint8(0), self.labels))

    def _ids(self) -> list[int]:
        return [c.id for c in self.clusters]

    def _smooth(self) -> NDArray[np.float32]:
        from scipy import ndimage

        return np.asarray(
            ndimage.gaussian_filter(
                ndimage.median_filter(self.image.data.astype(np.float32), 3), 1.5
            )
        )

    def _with(self, labels: NDArray[np.uint8]) -> Clustering:
        return finish(self.image, labels, self.noise, self.mixture, self.warnings, self.crop)


def cluster_image(
    image: GreyImage,
    *,
    n_clusters: int | None = None,
    exclude: Sequence[Area | NDArray[Any]] = (),
    progress: Progress | None = None,
    random_state: int = 0,
) -> Clustering:
    """Find the clusters of grey of an image."""
    from scipy import ndimage

    data = image.data
    first, end = used_rows(data, image.provenance.get("image_rows"))
    outside = mask_of(exclude, data.shape)
    part = data[first:end].astype(np.float32)
    noise = estimate_noise(data[first:end])
    smooth = ndimage.gaussian_filter(ndimage.median_filter(part, 3), 1.5)
    gradient = np.hypot(ndimage.sobel(smooth, 0), ndimage.sobel(smooth, 1)) / 8
    sd = noise.sd(smooth)
    calm = gradient < 0.35 * sd
    if calm.mean() < 0.2:
        calm = gradient < np.quantile(gradient, 0.5)
    greys = smooth[calm]
    values, edges = np.histogram(greys, bins=400)
    centres = (edges[1:] + edges[:-1]) / 2
    width = float(edges[1] - edges[0])
    keep = values > 0
    floor = float(np.median(sd)) * 0.35
    best = None
    for k in [n_clusters] if n_clusters else range(1, 9):
        model = GreyMixture(
            k,
            noise=(floor**2, 0.0),
            spread="floor",
            bin_width=width,
            n_init=3,
            random_state=random_state,
        ).fit(centres[keep], sample_weight=values[keep])
        m, s, w = model.means_[:, 0], np.sqrt(model.covariances_[:, 0, 0]), model.weights_
        apart = np.diff(m) / np.sqrt((s[1:] ** 2 + s[:-1] ** 2) / 2) if k > 1 else np.array([9.0])
        if not n_clusters and (apart.min() < 3.0 or w.min() < 0.01):
            continue
        bic = model.bic(centres[keep], sample_weight=values[keep] / 50)
        if best is None or bic < best[0]:
            best = (bic, model)
    assert best is not None
    model = best[1]
    label = (model.predict(smooth.ravel()) + 1).astype(np.uint8).reshape(smooth.shape)
    labels = np.zeros(data.shape, np.uint8)
    labels[first:end] = label
    if outside is not None:
        labels[outside] = 0
    if progress is not None:
        progress(1.0, "clusters")
    mixture = Components(model.weights_, model.means_[:, 0], np.sqrt(model.covariances_[:, 0, 0]))
    return finish(image, labels, noise, mixture, image.flags, (first, end, 0, data.shape[1]))


def finish(
    image: GreyImage,
    labels: NDArray[np.uint8],
    noise: NoiseLaw,
    mixture: Components,
    warnings: tuple[Finding, ...],
    crop: tuple[int, int, int, int],
) -> Clustering:
    """Number clusters by ascending grey and measure everything that depends on the labels."""
    from scipy import ndimage

    if not labels.any():
        raise InputError("Nothing of the image is left; exclude less.")
    size = np.bincount(labels.ravel(), minlength=256)
    total = np.bincount(labels.ravel(), weights=image.data.ravel(), minlength=256)
    present = [k for k in range(1, 256) if size[k]]
    present.sort(key=lambda k: total[k] / size[k])
    lookup = np.zeros(256, np.uint8)
    lookup[present] = np.arange(1, len(present) + 1)
    labels = lookup[labels]
    filled = np.where(labels == 0, ndimage.maximum_filter(labels, 3), labels)
    edge = ndimage.maximum_filter(filled, 3) != ndimage.minimum_filter(filled, 3)
    clusters, regions = measure(image.data, labels, edge, noise, image.pixel_size_nm)
    values, counts = np.unique(image.data[labels > 0], return_counts=True)
    histogram = (values.astype(float), counts)
    return Clustering(
        clusters, labels, edge, histogram, mixture, noise, warnings, regions, crop, image
    )
