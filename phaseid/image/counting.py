"""Histograms of raw greys, and where the range of greys is cut off."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from phaseid.image.greyimage import GreyImage

STRIP = 512
FLOAT_BINS = 4096
# At a cut-off end, this many times more pixels than on the next greys inwards.
PILE = 4.0
LEAST_SHARE = 1e-4


def grey_counts(
    data: NDArray[Any], labels: NDArray[np.uint8] | None = None
) -> tuple[NDArray[np.float64], NDArray[np.int64]]:
    """Count greys of labelled pixels.

    Parameters
    ----------
    data : ndarray of shape (rows, columns)
    labels : ndarray of uint8, optional
        Pixels of label 0 are not counted.

    Returns
    -------
    values, counts : ndarray
        Integer greys from the lowest to the highest that occurs; 4096 bins for floats.
    """
    if data.dtype.kind == "u":
        counts = np.zeros(np.iinfo(data.dtype).max + 1, dtype=np.int64)
        for part, chosen in _strips(data, labels):
            flat = part.ravel() if chosen is None else part[chosen]
            counts += np.bincount(flat, minlength=len(counts))
        used = np.flatnonzero(counts)
        if not len(used):
            return np.zeros(0), np.zeros(0, dtype=np.int64)
        span = slice(int(used[0]), int(used[-1]) + 1)
        return np.arange(span.start, span.stop).astype(float), counts[span]
    edges = np.linspace(float(data.min()), float(data.max()), FLOAT_BINS + 1)
    total = np.zeros(FLOAT_BINS, dtype=np.int64)
    for part, chosen in _strips(data, labels):
        total += np.histogram(part if chosen is None else part[chosen], bins=edges)[0]
    return (edges[1:] + edges[:-1]) / 2, total


def _strips(data: NDArray[Any], labels: NDArray[np.uint8] | None):  # type: ignore[no-untyped-def]
    for first in range(0, data.shape[0], STRIP):
        part = data[first : first + STRIP]
        yield part, None if labels is None else labels[first : first + STRIP] > 0


def range_ends(
    histogram: tuple[NDArray[np.float64], NDArray[np.int64]], image: GreyImage
) -> tuple[float | None, float | None]:
    """Greys at which the range is cut off.

    The ends of the container always count; an end inside it counts where pixels pile up on it, as they do
    after a contrast stretch. Floats have an end only where pixels pile up.
    """
    values, counts = histogram
    if not len(values):
        return None, None
    low, high = _pile(values, counts), _pile(values[::-1], counts[::-1])
    limits = image.full_range
    if limits is not None:
        low = limits[0] if low is None else low
        high = limits[1] if high is None else high
    return low, high


def _pile(values: NDArray[np.float64], counts: NDArray[np.int64]) -> float | None:
    if len(counts) < 8 or counts[0] < LEAST_SHARE * counts.sum():
        return None
    # A comb has empty greys: compare with the fullest of the next few.
    return float(values[0]) if counts[0] > PILE * counts[1:6].max() else None


def grey_step(data: NDArray[Any]) -> float:
    """Typical distance between greys that occur: 1, or more for a stretched or reduced image."""
    values, counts = grey_counts(data)
    used = values[counts > 0]
    if len(used) < 3:
        return 1.0
    # Tails hold single pixels with gaps between; the bulk tells.
    order = np.cumsum(counts[counts > 0]) / counts.sum()
    bulk = used[(order > 0.02) & (order < 0.98)]
    return float(np.median(np.diff(bulk))) if len(bulk) > 2 else 1.0
