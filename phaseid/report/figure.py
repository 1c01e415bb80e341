"""One figure: the image beside its clusters, and the grey axis with measured and predicted greys."""

from __future__ import annotations

import io
from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from phaseid.image.clustering import Clustering
from phaseid.image.reading import GreyImage

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

# Distinguishable with the usual colour deficiencies (Okabe & Ito 2008); clusters are also numbered.
COLOURS = ("#0072B2", "#E69F00", "#009E73", "#CC79A7", "#D55E00", "#56B4E9", "#F0E442", "#000000")
LARGEST_SIDE = 1400
CANDIDATES_SHOWN = 4
LEAST_SHOWN = 0.002


def figure(image: GreyImage, clustering: Clustering, document: Mapping[str, Any]) -> Figure:
    """Draw the figure of one candidates document.

    Parameters
    ----------
    image : GreyImage
    clustering : Clustering
    document : mapping
        As from `phaseid.report.document.document`.

    Returns
    -------
    matplotlib.figure.Figure
        Not attached to any window.
    """
    from matplotlib.figure import Figure

    drawn = Figure(figsize=(12, 9.5), layout="constrained")
    grid = drawn.add_gridspec(2, 2, height_ratios=[1.15, 1.0])
    step = max(1, int(np.ceil(max(image.data.shape) / LARGEST_SIDE)))
    _picture(drawn.add_subplot(grid[0, 0]), image, step)
    _clusters(drawn.add_subplot(grid[0, 1]), image, clustering, document["clusters"], step)
    _axis(drawn.add_subplot(grid[1, :]), clustering, document["clusters"])
    return drawn


def to_bytes(drawn: Figure, kind: str = "png", dpi: int = 130) -> bytes:
    """Render a figure."""
    stream = io.BytesIO()
    drawn.savefig(stream, format=kind, dpi=dpi)
    return stream.getvalue()


def colour(position: int) -> str:
    """Colour of the cluster at a position."""
    return COLOURS[position % len(COLOURS)]


def _picture(axes: Axes, image: GreyImage, step: int) -> None:
    data = image.data[::step, ::step]
    finite = data[np.isfinite(data)]
    low, high = (float(v) for v in np.percentile(finite, [0.2, 99.8]))
    axes.imshow(data, cmap="gray", vmin=low, vmax=max(high, low + 1e-9), interpolation="nearest")
    axes.set_title("Image")
    _bare(axes)
    _scale_bar(axes, image, step)


def _scale_bar(axes: Axes, image: GreyImage, step: int) -> None:
    if not image.pixel_size_nm:
        return
    per_shown = image.pixel_size_nm * step
    rows, columns = np.array(image.data.shape) // step
    target = 0.25 * columns * per_shown
    decade = 10 ** np.floor(np.log10(target))
    length = max(n * decade for n in (1, 2, 5) if n * decade <= target)
    wide = length / per_shown
    text = f"{length / 1000:g} µm" if length >= 1000 else f"{length:g} nm"
    left, base = 0.04 * columns, 0.95 * rows
    axes.plot([left, left + wide], [base, base], color="white", linewidth=5, solid_capstyle="butt")
    axes.plot(
        [left, left + wide], [base, base], color="black", linewidth=2.5, solid_capstyle="butt"
    )
    box = {"facecolor": "white", "edgecolor": "none", "pad": 1.5, "alpha": 0.8}
    axes.text(left, base - 0.02 * rows, text, va="bottom", fontsize=8, bbox=box)


def _clusters(
    axes: Axes,
    image: GreyImage,
    clustering: Clustering,
    clusters: Sequence[Mapping[str, Any]],
    step: int,
) -> None:
    from matplotlib.colors import to_rgb
    from matplotlib.patches import Patch

    labels = clustering.labels[::step, ::step]
    canvas = np.full((*labels.shape, 3), 0.85)
    handles = []
    for n, cluster in enumerate(clusters):
        canvas[labels == cluster["id"]] = to_rgb(colour(n))
        text = f"{cluster['id']}: {cluster['area_fraction']:.2%}"
        handles.append(Patch(color=colour(n), label=text))
    axes.imshow(canvas, interpolation="nearest")
    axes.set_title("Clusters, with share of the area")
    axes.legend(
        handles=handles, loc="center left", bbox_to_anchor=(1.0, 0.5), fontsize=8, frameon=False
    )
    _bare(axes)


def _axis(axes: Axes, clustering: Clustering, clusters: Sequence[Mapping[str, Any]]) -> None:
    """Measured greys above the line, predicted greys of the leading candidates below it."""
    values, counts = clustering.histogram
    bins = _rebinned(np.asarray(values, dtype=float), np.asarray(counts, dtype=float))
    top = float(np.sqrt(bins[1].max())) or 1.0
    axes.fill_between(bins[0], np.sqrt(bins[1]) / top, color="0.8", step="mid", linewidth=0)
    for n, cluster in enumerate(clusters):
        centre, sd = cluster["grey_mean"], max(cluster["grey_sd"] or 0.0, 1e-9)
        near = np.linspace(centre - 4 * sd, centre + 4 * sd, 120)
        width = float(np.median(np.diff(bins[0]))) if len(bins[0]) > 1 else 1.0
        density = np.exp(-0.5 * ((near - centre) / sd) ** 2) / (sd * np.sqrt(2 * np.pi))
        height = np.sqrt(density * width * cluster["area_fraction"] * bins[1].sum()) / top
        axes.plot(near, height, color=colour(n), linewidth=1.6)
        axes.text(
            centre,
            height.max() + 0.03,
            str(cluster["id"]),
            color=colour(n),
            ha="center",
            weight="bold",
        )
    depth = _candidates_below(axes, clusters)
    axes.axhline(0.0, color="black", linewidth=0.8)
    axes.set_ylim(-depth, 1.15)
    low, high = _span(clusters, bins[0])
    axes.set_xlim(low, high)
    axes.set_yticks([])
    axes.set_xlabel("grey level")
    axes.set_title(
        "Above: histogram (square root of counts) and fitted clusters.  "
        "Below: leading candidates at their predicted grey ± 1 sd",
        fontsize=9,
    )


def _candidates_below(axes: Axes, clusters: Sequence[Mapping[str, Any]]) -> float:
    level = 0.0
    for n, cluster in enumerate(clusters):
        shown = [
            c
            for c in cluster["candidates"]
            if c["predicted_grey"] is not None and c["probability"] >= LEAST_SHOWN
        ]
        for candidate in shown[:CANDIDATES_SHOWN]:
            level += 1
            height = -0.075 * level
            grey, sd = candidate["predicted_grey"], candidate["predicted_grey_sd"]
            axes.errorbar(
                grey, height, xerr=sd, color=colour(n), marker="o", markersize=3.5, linewidth=1
            )
            percent = f"{100 * candidate['probability']:.0f} %"
            axes.annotate(
                f"{candidate['phase']}  {percent}",
                (grey + sd, height),
                xytext=(5, 0),
                textcoords="offset points",
                va="center",
                fontsize=7,
            )
        level += 0.4 if shown else 0.0
    return 0.075 * (level + 1)


def _rebinned(
    values: NDArray[np.float64], counts: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    if len(values) <= 400:
        return values, counts
    edges = np.linspace(values[0], values[-1], 301)
    summed, _ = np.histogram(values, bins=edges, weights=counts)
    return (edges[1:] + edges[:-1]) / 2, summed


def _span(
    clusters: Sequence[Mapping[str, Any]], values: NDArray[np.float64]
) -> tuple[float, float]:
    greys = [c["grey_mean"] for c in clusters] or [float(values[0]), float(values[-1])]
    low, high = min(greys), max(greys)
    margin = 0.12 * max(high - low, 1e-6)
    # Room on the right for the names of the brightest candidates.
    return low - margin, high + 3 * margin


def _bare(axes: Axes) -> None:
    axes.set_xticks([])
    axes.set_yticks([])
