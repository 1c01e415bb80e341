"""From a grey image to clusters of grey."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from phaseid.errors import InputError
from phaseid.image import editing
from phaseid.image.areas import Area, mask_of
from phaseid.image.clusters import Cluster, Components
from phaseid.image.finding_clusters import Found, find_clusters
from phaseid.image.greyimage import GreyImage
from phaseid.image.noise import NoiseLaw
from phaseid.image.notices import Finding
from phaseid.image.settled import settle
from phaseid.image.shading import Shading
from phaseid.image.smoothing import labelled_by, smoothed_greys

__all__ = ["Cluster", "Clustering", "Progress", "cluster_image"]

Progress = Callable[[float, str], None]


@dataclass(frozen=True, eq=False)
class Clustering:
    """Clusters of one image.

    Attributes
    ----------
    image : GreyImage
    clusters : tuple of Cluster
        Ascending grey; ids count from 1.
    labels : ndarray of uint8, shape (rows, columns)
        Id of the cluster of each pixel; 0 for the bar and excluded areas.
    edge_bits : ndarray of uint8
        The mask `edge`, eight pixels a byte.
    histogram : (values, counts)
        Of all pixels that are labelled.
    mixture : Components
    noise : NoiseLaw
    shading : Shading
        In units of the noise, over the rows and columns of `crop`.
    warnings : tuple of Finding
    region_table : ndarray of REGION_FIELDS
        One row per connected region.
    crop : (first row, end row, first column, end column)
        What was looked at: without the bar.
    blur_px : float
        Standard deviation of the borders' blur.
    corrections : dict
        Greys of clusters of small specks, by their place in the grey order, as `(mean, error)`.
    """

    image: GreyImage
    clusters: tuple[Cluster, ...]
    labels: NDArray[np.uint8]
    edge_bits: NDArray[np.uint8]
    histogram: tuple[NDArray[np.float64], NDArray[np.int64]]
    mixture: Components
    noise: NoiseLaw
    shading: Shading
    warnings: tuple[Finding, ...]
    region_table: NDArray[Any]
    crop: tuple[int, int, int, int]
    blur_px: float = 1.0

    @property
    def edge(self) -> NDArray[np.bool_]:
        """Pixels within two of another cluster; they do not enter the means."""
        columns = self.labels.shape[1]
        return np.unpackbits(self.edge_bits, axis=1, count=columns).view(bool)

    @property
    def phases(self) -> tuple[Cluster, ...]:
        """Clusters that are not pores, cracks or mounting medium."""
        return tuple(c for c in self.clusters if c.kind == "phase")

    def nearest(self, grey: float) -> Cluster:
        """Cluster whose mean is nearest a grey."""
        return min(self.clusters, key=lambda c: abs(c.grey_mean - grey))

    def merge(self, ids: Sequence[int]) -> Clustering:
        """Make one cluster of several.

        Raises
        ------
        InputError
            If an id does not exist, or fewer than two are given.
        """
        return self._with(editing.merged(self.labels, ids, self._ids()))

    def split(self, id: int, parts: int = 2) -> Clustering:
        """Divide a cluster by grey into `parts`.

        Raises
        ------
        InputError
            If the cluster does not exist or has not so many greys.
        """
        smooth = self._smooth()
        changed = editing.split(self.labels, smooth, id, parts, self._means(), self._labelled)
        return self._with(changed)

    def move_boundary(self, a: int, b: int, grey: float) -> Clustering:
        """Divide the pixels of two clusters anew at a grey (of the locally averaged image).

        Raises
        ------
        InputError
            If a cluster does not exist or would be empty.
        """
        mean = self._means()
        if a in mean and b in mean and mean[a] > mean[b]:
            a, b = b, a
        changed = editing.boundary_moved(
            self.labels, self._smooth(), a, b, grey, mean, self._labelled
        )
        return self._with(changed)

    def exclude(self, *areas: Area | NDArray[Any]) -> Clustering:
        """Leave areas out; the clusters are measured on what remains.

        Raises
        ------
        InputError
            If an area lies outside the image, or nothing remains.
        """
        outside = mask_of(areas, self.labels.shape)
        if outside is None:
            return self
        return self._with(np.where(outside, np.uint8(0), self.labels))

    def _ids(self) -> list[int]:
        return [c.id for c in self.clusters]

    def _means(self) -> dict[int, float]:
        return {c.id: c.grey_mean for c in self.clusters}

    def _labelled(self, greys: Sequence[float]) -> NDArray[np.uint8]:
        return labelled_by(self.image.data, self.noise, self.shading, self.crop, greys)

    def _smooth(self) -> NDArray[np.float32]:
        return smoothed_greys(self.image.data, self.noise, self.shading, self.crop)

    def _with(self, labels: NDArray[np.uint8]) -> Clustering:
        # What was said of single clusters no longer holds; what was said of the image does.
        kept = {c.id: c for c in self.clusters if c.interior_pixels == 0 or c.notes}
        found = Found(
            labels, self.noise, self.shading, self.crop, self.warnings, self.blur_px, {}, kept
        )
        return _finished(self.image, found)


def cluster_image(
    image: GreyImage,
    *,
    n_clusters: int | None = None,
    exclude: Sequence[Area | NDArray[Any]] = (),
    progress: Progress | None = None,
    random_state: int = 0,
) -> Clustering:
    """Find the clusters of grey of an image.

    Parameters
    ----------
    image : GreyImage
    n_clusters : int, optional
        Force this number; by default it is chosen.
    exclude : sequence of Area or ndarray of bool
        What to leave out, in pixels of the whole image.
    progress : callable, optional
        Called with the share done, 0 to 1, and what is being done. It may raise to interrupt.
    random_state : int
        Seed of the fits that need one.

    Returns
    -------
    Clustering

    Raises
    ------
    InputError
        If nothing of the image is left, or `n_clusters` cannot be had.
    """
    if n_clusters is not None and not 1 <= n_clusters <= editing.MOST_CLUSTERS:
        raise InputError(
            f"{n_clusters} clusters were asked for; give a number from 1 to {editing.MOST_CLUSTERS}."
        )
    outside = mask_of(exclude, image.shape)
    found = find_clusters(image, outside, progress or _silent, random_state)
    clustering = _finished(image, found)
    if n_clusters is not None:
        clustering = _forced(clustering, n_clusters)
    return clustering


def _silent(share: float, what: str) -> None:
    return None


def _finished(image: GreyImage, found: Found) -> Clustering:
    settled = settle(image, found)
    return Clustering(
        image,
        settled.clusters,
        settled.labels,
        settled.edge_bits,
        settled.histogram,
        settled.mixture,
        found.noise,
        found.shading,
        settled.warnings,
        settled.regions,
        found.crop,
        found.blur_px,
    )


def _forced(clustering: Clustering, wanted: int) -> Clustering:
    """Merge the least different clusters, or split the widest, until the number is right."""
    while len(clustering.clusters) > wanted:
        pairs = list(zip(clustering.clusters[:-1], clustering.clusters[1:], strict=True))
        a, b = min(pairs, key=lambda p: _loss(*p))
        clustering = clustering.merge([a.id, b.id])
    while len(clustering.clusters) < wanted:
        clustering = _split_widest(clustering)
    note = Finding(
        "forced-number",
        f"The number of clusters was set to {wanted} by the user.",
        "Leave it to be chosen to see what the image itself supports.",
        "note",
    )
    others = tuple(w for w in clustering.warnings if w.code != note.code)
    return replace(clustering, warnings=(*others, note))


def _loss(a: Cluster, b: Cluster) -> float:
    """Increase in squared deviation when two clusters become one (Ward 1963)."""
    weight = a.pixels * b.pixels / (a.pixels + b.pixels)
    return weight * (a.grey_mean - b.grey_mean) ** 2


def _split_widest(clustering: Clustering) -> Clustering:
    order = sorted(clustering.clusters, key=lambda c: c.pixels * c.grey_sd**2, reverse=True)
    for cluster in order:
        try:
            return clustering.split(cluster.id, 2)
        except InputError:
            continue
    raise InputError(
        f"The image has only {len(clustering.clusters)} distinguishable greys; ask for fewer clusters."
    )
