"""Images and their clusters, kept as long as nothing they depend on changes."""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any, TypeVar

import numpy as np

from phaseid.image.clustering import Cluster, Clustering
from phaseid.image.notices import Finding
from phaseid.image.reading import GreyImage, read_image
from phaseid.session.editing import cluster, shape
from phaseid.session.state import Edit, ImageRef

T = TypeVar("T")
Progress = Callable[[float, str], None]

# Images and label maps are large; a few kept make undo instant without filling the memory.
KEPT_IMAGES = 4
KEPT_CLUSTERINGS = 8

_SHAPING = ("merge", "split", "boundary")


@dataclass(frozen=True)
class Summary:
    """An image without its pixels: small enough to keep for every field of a long series."""

    sha256: str
    energy_keV: float | None
    tilt_deg: float | None
    clusters: tuple[Cluster, ...]
    diameters_um: tuple[float, ...]
    findings: tuple[Finding, ...]


class Pictures:
    """A cache of images and clusterings, keyed by everything they depend on."""

    def __init__(self) -> None:
        self._images: OrderedDict[tuple[str, int | None], GreyImage] = OrderedDict()
        self._clusterings: OrderedDict[object, Clustering] = OrderedDict()
        self._summaries: dict[object, Summary] = {}

    def image(self, ref: ImageRef) -> GreyImage:
        """Read an image, unless it was read lately.

        Raises
        ------
        InputError
            If it cannot be read.
        """
        return _kept(
            self._images,
            (ref.path, ref.page),
            lambda: read_image(Path(ref.path), page=ref.page),
            KEPT_IMAGES,
        )

    def summary(
        self, ref: ImageRef, edits: Sequence[Edit], progress: Progress | None = None
    ) -> Summary:
        """What the ranking needs of an image.

        Raises
        ------
        InputError
            If the image cannot be read or an edit does not fit it.
        """
        key = (ref.path, ref.page, tuple(edits))
        if key not in self._summaries:
            image, made = self.image(ref), self.clustering(ref, edits, progress)
            self._summaries[key] = Summary(
                image.sha256,
                image.energy_keV,
                image.tilt_deg,
                tuple(made.clusters),
                _diameters(made),
                (*image.flags, *made.warnings),
            )
        return self._summaries[key]

    def clustering(
        self, ref: ImageRef, edits: Sequence[Edit], progress: Progress | None = None
    ) -> Clustering:
        """Cluster an image and apply the user's edits.

        A forced number and excluded areas act on the pixels, so they come first, whenever they were
        made; the edits of clusters follow in their order, each finding its clusters by grey.

        Raises
        ------
        InputError
            If an edit does not fit the clusters.
        """
        ordered = sorted(edits, key=lambda e: e.kind in _SHAPING)
        return self._clustered(ref, tuple(ordered), progress)

    def _clustered(
        self, ref: ImageRef, edits: tuple[Edit, ...], progress: Progress | None
    ) -> Clustering:
        def make() -> Clustering:
            if edits and edits[-1].kind in _SHAPING:
                return shape(self._clustered(ref, edits[:-1], progress), edits[-1])
            return cluster(self.image(ref), edits, progress)

        return _kept(self._clusterings, (ref.path, ref.page, edits), make, KEPT_CLUSTERINGS)


def _diameters(made: Clustering) -> tuple[float, ...]:
    """Diameter of each cluster's typical region by area; NaN where the pixel size is not known."""
    found = []
    for one in made.clusters:
        mine = made.region_table[made.region_table["cluster"] == one.id]
        order = np.argsort(mine["equivalent_diameter_um"], kind="stable")
        share = np.cumsum(mine["pixels"][order])
        if not len(share) or not np.isfinite(mine["equivalent_diameter_um"]).all():
            found.append(float("nan"))
            continue
        half = order[min(int(np.searchsorted(share, share[-1] / 2)), len(order) - 1)]
        found.append(float(mine["equivalent_diameter_um"][half]))
    return tuple(found)


def _kept(cache: OrderedDict[Any, T], key: object, make: Callable[[], T], most: int) -> T:
    """Take a value from a cache, or make it and drop the one used longest ago."""
    if key not in cache:
        made = make()
        cache[key] = made
        while len(cache) > most:
            cache.popitem(last=False)
    cache.move_to_end(key)
    return cache[key]
