"""Images of a detector in four parts: their sum for composition, their differences for slope.

Common practice: the sum of the quadrants strengthens composition, the differences topography. Here the
differences also say where the sum cannot be trusted.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from phaseid.errors import InputError
from phaseid.image.greyimage import GreyImage
from phaseid.image.notices import Finding
from phaseid.physics.detector import Detector
from phaseid.physics.quadrants import slope_deg, slope_error

# Change of a pixel's signal by its slope that falsifies its grey: below it, two elements apart by one in
# atomic number near iron (2.8 %) still can be told apart.
MOST_CHANGE = 0.02
# A medium signal, at which the change by slope is judged.
_ETA, _Z = 0.25, 20.0
# The slope is averaged over this many pixels: single pixels are mostly noise.
_SMOOTH_PX = 2.0


@dataclass(frozen=True)
class Quadrants:
    """What four quadrants tell together.

    Attributes
    ----------
    composition : GreyImage
        Mean of the four, float32; pixels on slopes are marked in `composition.unusable`.
    slope_deg : ndarray of shape (rows, columns)
    sloped : ndarray of bool, shape (rows, columns)
        Where the slope falsifies the grey.
    """

    composition: GreyImage
    slope_deg: NDArray[np.float32]
    sloped: NDArray[np.bool_]


def combine(
    images: Sequence[GreyImage],
    *,
    dark: float = 0.0,
    detector: Detector | None = None,
    most_change: float = MOST_CHANGE,
) -> Quadrants:
    """Combine four quadrants.

    Parameters
    ----------
    images : sequence of four GreyImage
        Facing +x (right), +y (up), -x and -y.
    dark : float
        Grey with no beam, the same in all four.
    detector : Detector or None
        For its angles.
    most_change : float
        Relative change of the signal by slope above which a pixel is masked.

    Returns
    -------
    Quadrants

    Raises
    ------
    InputError
        If there are not four images of one size, or the dark level lies above the greys.
    """
    from scipy.ndimage import gaussian_filter

    if len(images) != 4:
        raise InputError(f"Four quadrants are needed, {len(images)} images were given.")
    shapes = {i.shape for i in images}
    if len(shapes) > 1:
        told = ", ".join(f"{r} x {c}" for r, c in sorted(shapes))
        raise InputError(f"The quadrants differ in size ({told}); give four images of one field.")
    parts = [i.data.astype(np.float32) - np.float32(dark) for i in images]
    mean = sum(parts[1:], parts[0]) / np.float32(4)
    if float(np.median(mean)) <= 0:
        raise InputError(
            f"The dark level {dark:g} lies above the greys of the quadrants; lower it."
        )
    smooth = [gaussian_filter(p, _SMOOTH_PX) for p in parts]
    x, y = _difference(smooth[0], smooth[2]), _difference(smooth[1], smooth[3])
    # Quadrants are never alike to the last per cent: most of a polished section is flat.
    slope = slope_deg(x - np.median(x), y - np.median(y), detector or Detector())
    steepest = _steepest(most_change)
    sloped = np.asarray(slope > steepest)
    findings = images[0].flags
    if sloped.any():
        findings = (
            *findings,
            Finding(
                "slopes",
                f"{sloped.mean():.1%} of the area slopes by more than {steepest:.1f} degrees, which changes "
                f"the signal by more than {most_change:.0%}; it is left out.",
                "Polish flatter where it matters.",
                "note",
            ),
        )
    composition = replace(
        images[0],
        data=np.ascontiguousarray(mean + np.float32(dark), dtype=np.float32),
        bits=32,
        flags=findings,
        unusable=sloped,
    )
    return Quadrants(composition, slope.astype(np.float32), sloped)


def _difference(first: NDArray[np.float32], second: NDArray[np.float32]) -> NDArray[np.float64]:
    total = np.maximum(first + second, 1e-6)
    return np.asarray((first - second) / total, dtype=np.float64)


def _steepest(most_change: float) -> float:
    """Slope at which a medium signal changes by a given share."""
    slopes = np.linspace(0.0, 60.0, 601)
    change = np.abs(slope_error(slopes, _ETA, _Z))
    return float(np.interp(most_change, np.maximum.accumulate(change), slopes))
