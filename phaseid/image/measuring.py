"""From a label map to clusters and regions with their greys and standard errors."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from phaseid.image.clusters import REGION_FIELDS, Cluster
from phaseid.image.noise import NoiseLaw


def measure(
    data: NDArray[Any],
    labels: NDArray[np.uint8],
    edge: NDArray[np.bool_],
    noise: NoiseLaw,
    pixel_size_nm: float | None,
) -> tuple[tuple[Cluster, ...], NDArray[Any]]:
    """Measure clusters and regions.

    Parameters
    ----------
    data, labels, edge : ndarray of shape (rows, columns)
    noise : NoiseLaw
    pixel_size_nm : float or None

    Returns
    -------
    clusters : tuple of Cluster
        In the order of their labels.
    regions : ndarray of REGION_FIELDS
    """
    from scipy import ndimage

    used = int(np.count_nonzero(labels))
    clusters: list[Cluster] = []
    tables = []
    for k in range(1, int(labels.max()) + 1):
        inside = labels == k
        numbered, count = ndimage.label(inside)
        table = _regions(data, numbered, count, edge, k, noise, pixel_size_nm)
        tables.append(table)
        core = inside & ~edge
        if not core.any():
            core = inside
        values = data[core].astype(float)
        n = len(values)
        mean, sd = float(values.mean()), float(values.std())
        low, high = _ends(data)
        clipped = None
        if low is not None and np.mean(values <= low) > 0.05:
            clipped = "low"
        elif high is not None and np.mean(values >= high) > 0.05:
            clipped = "high"
        clusters.append(
            Cluster(
                k,
                mean,
                _standard_error(table, sd, n, noise),
                sd,
                clipped,  # type: ignore[arg-type]
                int(inside.sum()) / max(used, 1),
                int(inside.sum()),
                count,
                interior_pixels=n,
                weight=int(inside.sum()) / max(used, 1),
                component_sd=sd,
            )
        )
    return tuple(clusters), np.concatenate(tables) if tables else np.zeros(0, REGION_FIELDS)


def _ends(data: NDArray[Any]) -> tuple[float | None, float | None]:
    if data.dtype.kind != "u":
        return None, None
    return 0.0, float(np.iinfo(data.dtype).max)


def _standard_error(table: NDArray[Any], sd: float, n: int, noise: NoiseLaw) -> float:
    base = sd * np.sqrt(noise.correlated_pixels / max(n, 1))
    weight = table["interior_pixels"].astype(float)
    if (weight > 20).sum() >= 3:
        w = weight / weight.sum()
        mean = float(w @ table["grey_mean"])
        base = max(base, float(np.sqrt(np.sum(w**2 * (table["grey_mean"] - mean) ** 2))))
    return float(max(base, 1e-9))


def _regions(
    data: NDArray[Any],
    numbered: NDArray[Any],
    count: int,
    edge: NDArray[np.bool_],
    k: int,
    noise: NoiseLaw,
    pixel_size_nm: float | None,
) -> NDArray[Any]:
    table = np.zeros(count, REGION_FIELDS)
    if not count:
        return table
    flat = numbered.ravel()
    pixels = np.bincount(flat, minlength=count + 1)[1:]
    on_edge = np.bincount(flat, weights=edge.ravel(), minlength=count + 1)[1:]
    weight = np.where(edge.ravel(), 1e-9, 1.0)
    total = np.bincount(flat, weights=weight, minlength=count + 1)[1:]
    grey = np.bincount(flat, weights=weight * data.ravel(), minlength=count + 1)[1:] / total
    rows, columns = np.indices(data.shape, dtype=np.float64).reshape(2, -1)
    table["region"] = np.arange(1, count + 1)
    table["cluster"] = k
    table["pixels"] = pixels
    table["row"] = np.bincount(flat, weights=rows, minlength=count + 1)[1:] / pixels
    table["column"] = np.bincount(flat, weights=columns, minlength=count + 1)[1:] / pixels
    table["equivalent_diameter_px"] = np.sqrt(4 * pixels / np.pi)
    size = np.nan if pixel_size_nm is None else pixel_size_nm / 1000
    table["equivalent_diameter_um"] = table["equivalent_diameter_px"] * size
    table["area_um2"] = pixels * size**2
    table["grey_mean"] = grey
    table["interior_pixels"] = pixels - on_edge
    n = np.maximum(table["interior_pixels"], 1)
    table["grey_se"] = np.sqrt(noise.variance(grey) * noise.correlated_pixels / n)
    table["edge_share"] = on_edge / pixels
    return table
