"""Changes a user makes to a clustering; each gives a new one that is measured again as a whole."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
from numpy.typing import NDArray

from phaseid.errors import InputError
from phaseid.image.mixture import GreyMixture

MOST_CLUSTERS = 250
Smoothed = Callable[[], NDArray[np.float32]]


def merged(
    labels: NDArray[np.uint8], ids: Sequence[int], known: Sequence[int]
) -> NDArray[np.uint8]:
    """Give all clusters of `ids` the lowest of their ids."""
    chosen = sorted({int(i) for i in ids})
    _known(chosen, known)
    if len(chosen) < 2:
        raise InputError("Merging needs at least two clusters; give two or more ids.")
    table = np.arange(256, dtype=np.uint8)
    table[chosen] = chosen[0]
    return np.asarray(table[labels])


def split(
    labels: NDArray[np.uint8],
    smooth: NDArray[np.float32],
    chosen: int,
    parts: int,
    known: Sequence[int],
) -> NDArray[np.uint8]:
    """Divide one cluster by the greys of its pixels, averaged over their neighbourhood."""
    _known([chosen], known)
    if parts < 2:
        raise InputError(f"A cluster is split into two parts or more; {parts} was given.")
    if len(known) + parts - 1 > MOST_CLUSTERS:
        raise InputError(
            f"An image can have at most {MOST_CLUSTERS} clusters; split into fewer parts."
        )
    inside = labels == chosen
    greys = smooth[inside]
    low, high = (float(v) for v in np.quantile(greys, [0.001, 0.999]))
    if not high > low:
        raise InputError(
            f"All pixels of cluster {chosen} have the grey {low:.4g}; it cannot be split."
        )
    counts, edges = np.histogram(greys, bins=512, range=(low, high))
    width = float(edges[1] - edges[0])
    centres = (edges[1:] + edges[:-1]) / 2
    model = GreyMixture(parts, bin_width=width, n_init=6, random_state=0)
    model.fit(centres, sample_weight=counts)
    part = model.predict(np.clip(greys, low, high))
    if len(np.unique(part)) < parts:
        raise InputError(
            f"Cluster {chosen} has no {parts} distinguishable greys; split it into fewer parts."
        )
    order = np.argsort([float(greys[part == n].mean()) for n in range(parts)])
    free = [n for n in range(1, 256) if n not in set(known)]
    names = np.array([chosen, *free[: parts - 1]], dtype=np.uint8)
    table = np.empty(parts, dtype=np.uint8)
    table[order] = names
    changed = labels.copy()
    changed[inside] = table[part]
    return changed


def boundary_moved(
    labels: NDArray[np.uint8],
    smooth: NDArray[np.float32],
    darker: int,
    brighter: int,
    grey: float,
    known: Sequence[int],
) -> NDArray[np.uint8]:
    """Divide the pixels of two clusters anew, at a grey."""
    _known([darker, brighter], known)
    if darker == brighter:
        raise InputError("A boundary lies between two different clusters; give two ids.")
    both = (labels == darker) | (labels == brighter)
    below = smooth[both] < grey
    if below.all() or not below.any():
        raise InputError(
            f"At grey {grey:.4g} one of the clusters {darker} and {brighter} would be empty; choose a grey "
            f"between {smooth[both].min():.4g} and {smooth[both].max():.4g}, or merge them."
        )
    changed = labels.copy()
    changed[both] = np.where(below, np.uint8(darker), np.uint8(brighter))
    return changed


def _known(ids: Sequence[int], known: Sequence[int]) -> None:
    for i in ids:
        if i not in known:
            raise InputError(
                f"There is no cluster {i}; the clusters are {', '.join(map(str, known)) or 'none'}."
            )
