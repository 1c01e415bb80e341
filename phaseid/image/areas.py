"""Areas of an image that the user leaves out."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from phaseid.errors import InputError


@dataclass(frozen=True)
class Rectangle:
    """Rows `row` to `row + height - 1`, columns `column` to `column + width - 1`."""

    row: int
    column: int
    height: int
    width: int

    def mask(self, shape: tuple[int, int]) -> NDArray[np.bool_]:
        """Pixels inside."""
        inside = np.zeros(shape, dtype=bool)
        r0, c0 = max(0, int(self.row)), max(0, int(self.column))
        r1, c1 = int(self.row + self.height), int(self.column + self.width)
        if (
            self.height <= 0
            or self.width <= 0
            or r1 <= 0
            or c1 <= 0
            or r0 >= shape[0]
            or c0 >= shape[1]
        ):
            raise InputError(
                f"The rectangle at row {self.row}, column {self.column} of {self.height} x {self.width} "
                f"pixels lies outside the image of {shape[0]} x {shape[1]}; give it in pixels from the "
                "upper left corner."
            )
        inside[r0:r1, c0:c1] = True
        return inside


@dataclass(frozen=True)
class Polygon:
    """Inside of a closed line through points (row, column)."""

    points: tuple[tuple[float, float], ...]

    def mask(self, shape: tuple[int, int]) -> NDArray[np.bool_]:
        """Pixels whose centre is inside, by the parity of the crossings of their row."""
        if len(self.points) < 3:
            raise InputError(
                f"A polygon needs at least three points (row, column); {len(self.points)} were given."
            )
        inside = np.zeros(shape, dtype=bool)
        points = np.asarray(self.points, dtype=float)
        following = np.roll(points, -1, axis=0)
        first = max(0, int(np.floor(points[:, 0].min())))
        last = min(shape[0] - 1, int(np.ceil(points[:, 0].max())))
        columns = np.arange(shape[1])
        for row in range(first, last + 1):
            crossing = (points[:, 0] <= row) != (following[:, 0] <= row)
            if not crossing.any():
                continue
            p, q = points[crossing], following[crossing]
            at = np.sort(p[:, 1] + (row - p[:, 0]) / (q[:, 0] - p[:, 0]) * (q[:, 1] - p[:, 1]))
            inside[row] = np.searchsorted(at, columns, side="right") % 2 == 1
        if not inside.any():
            raise InputError(
                "The polygon covers no pixel of the image; give rows and columns in pixels."
            )
        return inside


@dataclass(frozen=True)
class MaskFile:
    """Pixels that are not zero in an image file of the same size."""

    path: str

    def mask(self, shape: tuple[int, int]) -> NDArray[np.bool_]:
        """Pixels left out."""
        from phaseid.image.reading import read_image

        data = read_image(Path(self.path)).data
        if data.shape != shape:
            raise InputError(
                f"The mask {self.path} is {data.shape[0]} x {data.shape[1]} pixels, the image {shape[0]} x "
                f"{shape[1]}; they must match."
            )
        return np.asarray(data > 0)


Area = Rectangle | Polygon | MaskFile


def mask_of(
    areas: Sequence[Area | NDArray[Any]], shape: tuple[int, int]
) -> NDArray[np.bool_] | None:
    """Union of areas and boolean arrays; None if there are none.

    Raises
    ------
    InputError
        If an area lies outside the image or a mask has another shape.
    """
    if not areas:
        return None
    union = np.zeros(shape, dtype=bool)
    for area in areas:
        if isinstance(area, np.ndarray):
            if area.shape != shape:
                raise InputError(
                    f"A mask of shape {area.shape} does not match the image of shape {shape}."
                )
            union |= area.astype(bool)
        else:
            union |= area.mask(shape)
    return union
