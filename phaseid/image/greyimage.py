"""A grey image with what is known of how it was taken."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from phaseid.errors import InputError
from phaseid.image.notices import Finding

SMALLEST_SIDE = 8


@dataclass(frozen=True, eq=False)
class GreyImage:
    """One grey image.

    Attributes
    ----------
    data : ndarray of shape (rows, columns)
        Raw greys: uint8, uint16 or float32.
    path : str
        Where it came from.
    bits : int
        Bits per pixel of the container.
    pixel_size_nm, energy_keV, tilt_deg : float or None
        As the metadata say; None where they do not.
    detector : str or None
        Detector or signal named in the metadata.
    sha256 : str
        Hash of the file, or of the array.
    page, pages : int
        Index of the page that was read, and how many the file holds.
    provenance : dict
        Everything else the metadata say that matters: reader, bar height, gamma, and the like.
    flags : tuple of Finding
        What was noticed while reading.
    unusable : ndarray of bool or None
        Pixels that carry no grey, such as coloured annotations.
    """

    data: NDArray[Any]
    path: str = ""
    bits: int = 8
    pixel_size_nm: float | None = None
    energy_keV: float | None = None
    detector: str | None = None
    tilt_deg: float | None = None
    sha256: str = ""
    page: int = 0
    pages: int = 1
    provenance: Mapping[str, Any] = field(default_factory=dict)
    flags: tuple[Finding, ...] = ()
    unusable: NDArray[np.bool_] | None = None

    @property
    def shape(self) -> tuple[int, int]:
        """Rows and columns."""
        return int(self.data.shape[0]), int(self.data.shape[1])

    @property
    def full_range(self) -> tuple[float, float] | None:
        """Lowest and highest grey the container can hold; None for float images."""
        if self.data.dtype.kind == "u":
            return 0.0, float(2 ** min(self.bits, 8 * self.data.dtype.itemsize) - 1)
        return None


def checked_data(data: NDArray[Any], where: str) -> NDArray[Any]:
    """Bring an array to one of the grey types, or say why it cannot be one.

    Parameters
    ----------
    data : ndarray of shape (rows, columns)
    where : str
        Name for messages.

    Returns
    -------
    ndarray
        uint8, uint16 or float32.

    Raises
    ------
    InputError
        If it is no image of at least 8 x 8 finite, differing greys.
    """
    if data.ndim != 2:
        raise InputError(
            f"{where} has {data.ndim} dimensions of sizes {data.shape}; a grey image has two: "
            "choose one page or channel."
        )
    if min(data.shape) < SMALLEST_SIDE:
        raise InputError(
            f"{where} is {data.shape[0]} x {data.shape[1]} pixels; at least {SMALLEST_SIDE} x "
            f"{SMALLEST_SIDE} are needed: give the original image, not a thumbnail."
        )
    if data.dtype == np.bool_ or data.dtype.kind not in "uif":
        raise InputError(
            f"{where} holds {data.dtype} values; export the image with grey levels of 8 or 16 bits."
        )
    if data.dtype.kind == "f":
        data = np.ascontiguousarray(data, dtype=np.float32)
        bad = int(data.size - np.count_nonzero(np.isfinite(data)))
        if bad:
            raise InputError(
                f"{where} holds {bad} pixels that are not finite numbers (NaN or infinite); fill or "
                "crop them before the analysis."
            )
    elif data.dtype not in (np.uint8, np.uint16):
        low, high = int(data.min()), int(data.max())
        data = data.astype(np.uint16) if low >= 0 and high < 65536 else data.astype(np.float32)
    if data.min() == data.max():
        raise InputError(
            f"Every pixel of {where} has the grey {data.flat[0]:g}; there is nothing to tell apart: "
            "check detector, brightness and contrast."
        )
    return data
