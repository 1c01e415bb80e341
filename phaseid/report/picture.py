"""The image as a screen shows it: a window of it, the selected cluster lit, a cursor."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from phaseid.image.clustering import Clustering
from phaseid.image.reading import GreyImage

# Clusters that are not selected keep this share of their brightness.
DIMMED = 0.45


@dataclass(frozen=True)
class View:
    """A window on an image.

    Attributes
    ----------
    row, column : float
        Centre of the window, in pixels of the image.
    zoom : float
        1 shows the whole image.
    """

    row: float
    column: float
    zoom: float = 1.0

    @staticmethod
    def whole(shape: tuple[int, int]) -> View:
        """A view of the whole image."""
        return View(shape[0] / 2, shape[1] / 2)

    def window(self, shape: tuple[int, int], aspect: float) -> tuple[float, float, float, float]:
        """Top, left, height and width of the window that fills a frame of width over height `aspect`."""
        rows, columns = shape
        height = max(rows, columns / aspect) / self.zoom
        return self.row - height / 2, self.column - height * aspect / 2, height, height * aspect

    def moved(self, down: float, right: float, shape: tuple[int, int]) -> View:
        """Moved by shares of the window, never off the image."""
        step = max(shape) / self.zoom
        return replace(
            self,
            row=float(np.clip(self.row + down * step, 0, shape[0])),
            column=float(np.clip(self.column + right * step, 0, shape[1])),
        )

    def zoomed(self, factor: float) -> View:
        """Nearer or farther, between the whole image and 64 times."""
        return replace(self, zoom=float(np.clip(self.zoom * factor, 1.0, 64.0)))


def render(
    image: GreyImage,
    clustering: Clustering | None,
    view: View,
    size: tuple[int, int],
    selected: int | None = None,
    cursor: tuple[int, int] | None = None,
) -> NDArray[np.uint8]:
    """Draw a window of an image.

    Parameters
    ----------
    image : GreyImage
    clustering : Clustering or None
    view : View
    size : (int, int)
        Height and width of the drawing in pixels.
    selected : int or None
        Cluster to keep bright; the others are dimmed.
    cursor : (int, int) or None
        Row and column of a point to mark.

    Returns
    -------
    ndarray of uint8, shape (height, width)
    """
    height, width = size
    rows, columns = image.data.shape
    top, left, tall, wide = view.window((rows, columns), width / height)
    at_row = np.floor(top + (np.arange(height) + 0.5) * tall / height).astype(int)
    at_column = np.floor(left + (np.arange(width) + 0.5) * wide / width).astype(int)
    inside = np.outer((at_row >= 0) & (at_row < rows), (at_column >= 0) & (at_column < columns))
    pick = np.ix_(np.clip(at_row, 0, rows - 1), np.clip(at_column, 0, columns - 1))
    grey = _stretched(image.data, image.data[pick])
    if clustering is not None and selected is not None:
        grey = np.where(clustering.labels[pick] == selected, grey, DIMMED * grey)
    drawn = np.where(inside, grey, 0).astype(np.uint8)
    if cursor is not None:
        _cross(drawn, cursor, (top, left, tall, wide))
    return drawn


def point_at(
    view: View, shape: tuple[int, int], aspect: float, down: float, right: float
) -> tuple[int, int] | None:
    """Pixel of the image at a place of the frame given as shares of its height and width."""
    top, left, tall, wide = view.window(shape, aspect)
    row, column = int(top + down * tall), int(left + right * wide)
    if 0 <= row < shape[0] and 0 <= column < shape[1]:
        return row, column
    return None


@dataclass(frozen=True)
class Point:
    """What is known of one pixel: its grey, its cluster, its region's size."""

    row: int
    column: int
    grey: float
    cluster: int | None
    region_pixels: int | None
    region_um: float | None


def read_point(image: GreyImage, clustering: Clustering | None, row: int, column: int) -> Point:
    """Read one pixel.

    Parameters
    ----------
    image : GreyImage
    clustering : Clustering or None
    row, column : int

    Returns
    -------
    Point
    """
    grey = float(image.data[row, column])
    if clustering is None or not clustering.labels[row, column]:
        return Point(row, column, grey, None, None, None)
    label = int(clustering.labels[row, column])
    table = clustering.region_table
    mine = table[
        (table["cluster"] == label)
        & (table["first_row"] <= row)
        & (table["first_column"] <= column)
        & (row < table["first_row"] + table["height"])
        & (column < table["first_column"] + table["width"])
    ]
    if not len(mine):
        return Point(row, column, grey, label, None, None)
    # Bounding boxes can overlap; the smallest that holds the point is the likeliest.
    region = mine[int(np.argmin(mine["height"] * mine["width"]))]
    wide = float(region["equivalent_diameter_um"])
    return Point(
        row, column, grey, label, int(region["pixels"]), wide if np.isfinite(wide) else None
    )


def _stretched(data: NDArray[Any], part: NDArray[Any]) -> NDArray[np.float64]:
    step = max(1, int(np.sqrt(data.size / 250_000)))
    low, high = np.percentile(data[::step, ::step], [0.2, 99.8])
    return np.asarray(np.clip((part.astype(float) - low) / max(high - low, 1e-9), 0, 1) * 255.0)


def _cross(
    drawn: NDArray[np.uint8], cursor: tuple[int, int], window: tuple[float, float, float, float]
) -> None:
    top, left, tall, wide = window
    height, width = drawn.shape
    y = int((cursor[0] + 0.5 - top) / tall * height)
    x = int((cursor[1] + 0.5 - left) / wide * width)
    arm = max(3, height // 24)
    thick = max(1, height // 160)
    if 0 <= y < height and 0 <= x < width:
        for part in (
            np.s_[max(0, y - thick) : y + thick, max(0, x - arm) : x + arm],
            np.s_[max(0, y - arm) : y + arm, max(0, x - thick) : x + thick],
        ):
            drawn[part] = np.where(drawn[part] > 127, 0, 255)
