"""Changes a user makes to a clustering; each gives a new one that is measured again as a whole."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from phaseid.errors import InputError
from phaseid.image.mixture import GreyMixture

MOST_CLUSTERS = 250
# Labels every pixel with the index of one of the greys, ascending.
Labeller = Callable[[Sequence[float]], NDArray[np.uint8]]


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
    means: Mapping[int, float],
    labeller: Labeller,
) -> NDArray[np.uint8]:
    """Divide one cluster by the greys of its pixels, averaged over their neighbourhood.

    Parameters
    ----------
    labels : ndarray of uint8
    smooth : ndarray of float32
        Locally averaged greys.
    chosen : int
        The cluster.
    parts : int
    means : mapping
        Grey of every cluster.
    labeller : callable

    Returns
    -------
    ndarray of uint8
        New label map.
    """
    _known([chosen], list(means))
    if parts < 2:
        raise InputError(f"A cluster is split into two parts or more; {parts} was given.")
    if len(means) + parts - 1 > MOST_CLUSTERS:
        raise InputError(
            f"An image can have at most {MOST_CLUSTERS} clusters; split into fewer parts."
        )
    greys = _part_greys(smooth[labels == chosen], chosen, parts)
    changed = _divided(labels, smooth, [chosen], greys, means, labeller)
    if len(np.unique(changed[labels == chosen])) < parts:
        raise InputError(
            f"Cluster {chosen} has no {parts} distinguishable greys; split it into fewer parts."
        )
    return changed


def boundary_moved(
    labels: NDArray[np.uint8],
    smooth: NDArray[np.float32],
    darker: int,
    brighter: int,
    grey: float,
    means: Mapping[int, float],
    labeller: Labeller,
) -> NDArray[np.uint8]:
    """Divide the pixels of two clusters anew, at a grey."""
    _known([darker, brighter], list(means))
    if darker == brighter:
        raise InputError("A boundary lies between two different clusters; give two ids.")
    half = 0.5 * abs(means[brighter] - means[darker]) or 1.0
    changed = _divided(
        labels, smooth, [darker, brighter], [grey - half, grey + half], means, labeller
    )
    left = set(np.unique(changed[(labels == darker) | (labels == brighter)]).tolist())
    if len(left) < 2:
        both = smooth[(labels == darker) | (labels == brighter)]
        raise InputError(
            f"At grey {grey:.4g} one of the clusters {darker} and {brighter} would be empty; choose a "
            f"grey between {both.min():.4g} and {both.max():.4g}, or merge them."
        )
    return changed


def _part_greys(greys: NDArray[np.float32], chosen: int, parts: int) -> list[float]:
    low, high = (float(v) for v in np.quantile(greys, [0.001, 0.999]))
    if not high > low:
        raise InputError(
            f"All pixels of cluster {chosen} have the grey {low:.4g}; it cannot be split."
        )
    counts, edges = np.histogram(greys, bins=512, range=(low, high))
    centres = (edges[1:] + edges[:-1]) / 2
    model = GreyMixture(parts, bin_width=float(edges[1] - edges[0]), n_init=6, random_state=0)
    model.fit(centres, sample_weight=counts)
    return [float(m) for m in model.means_[:, 0]]


def _divided(
    labels: NDArray[np.uint8],
    smooth: NDArray[np.float32],
    chosen: Sequence[int],
    greys: Sequence[float],
    means: Mapping[int, float],
    labeller: Labeller,
) -> NDArray[np.uint8]:
    """Give the pixels of the chosen clusters to the nearest of new greys.

    The other clusters take part in the labelling, so that a blurred border with one of them is not
    taken for one of the new greys; their own pixels stay.
    """
    others = [m for k, m in means.items() if k not in chosen]
    palette = sorted([*greys, *others])
    free = [n for n in range(1, 256) if n not in means]
    names = [*chosen, *free][: len(greys)]
    name = dict(zip(sorted(greys), names, strict=True))
    inside = np.isin(labels, chosen)
    index = labeller(palette)[inside]
    table = np.array([name.get(g, 0) for g in palette], dtype=np.uint8)
    new = table[index]
    lost = new == 0
    middle = (np.sort(greys)[1:] + np.sort(greys)[:-1]) / 2
    new[lost] = np.array(names, dtype=np.uint8)[np.digitize(smooth[inside][lost], middle)]
    changed = labels.copy()
    changed[inside] = new
    return changed


def _known(ids: Sequence[int], known: Sequence[int]) -> None:
    for i in ids:
        if i not in known:
            raise InputError(
                f"There is no cluster {i}; the clusters are {', '.join(map(str, known)) or 'none'}."
            )
