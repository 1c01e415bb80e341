"""A detector divided into four: composition from the sum, slope from the differences.

The electrons leave a facet by a cosine law about its own normal, so a quadrant that the facet faces
gets more. For an annulus seen under angles from a1 to a2 and a slope t towards azimuth p::

    quadrant(q) ~ cos t (sin^2 a2 - sin^2 a1) pi/4 + sin t cos(p - q) sqrt(2) I,
    I = (a - sin a cos a)/2 between a1 and a2

as long as the facet sees the whole annulus (a2 + t <= 90 degrees). The difference of opposite
quadrants over their sum is then ``tan t cos(p - q)`` times a constant of the detector. The cosine
law leaves out the forward lobe of a tilted surface, so the slope of a steep facet comes out too
large; the tests compare with simulated trajectories.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from phaseid.physics.detector import Detector
from phaseid.physics.elements import Floats
from phaseid.physics.tilting import tilted_eta


def difference_per_slope(detector: Detector) -> float:
    """Difference over sum of two opposite quadrants per tangent of the slope towards one of them."""
    inner, outer = np.radians([detector.inner_angle_deg, detector.outer_angle_deg])
    sideways = (outer - np.sin(outer) * np.cos(outer) - inner + np.sin(inner) * np.cos(inner)) / 2
    straight = (np.sin(outer) ** 2 - np.sin(inner) ** 2) * np.pi / 4
    return float(np.sqrt(2.0) * sideways / straight)


def differences(
    slope_deg: ArrayLike, azimuth_deg: ArrayLike, detector: Detector
) -> tuple[Floats, Floats]:
    """Differences over sums that a facet gives.

    Parameters
    ----------
    slope_deg : array_like
        Angle between the facet's normal and the beam.
    azimuth_deg : array_like
        Direction the facet faces, 0 towards the +x quadrant, 90 towards +y.
    detector : Detector

    Returns
    -------
    x, y : ndarray
        ``(+x - -x) / (+x + -x)`` and the same along y.
    """
    slope = difference_per_slope(detector) * np.tan(np.radians(np.asarray(slope_deg, dtype=float)))
    azimuth = np.radians(np.asarray(azimuth_deg, dtype=float))
    x: Floats = slope * np.cos(azimuth)
    y: Floats = slope * np.sin(azimuth)
    return x, y


def slope_deg(difference_x: ArrayLike, difference_y: ArrayLike, detector: Detector) -> Floats:
    """Slope of a facet from its two differences over sums; the inverse of `differences`.

    Parameters
    ----------
    difference_x, difference_y : array_like
        With the dark level taken off the quadrants, and 0 on flat material.
    detector : Detector

    Returns
    -------
    ndarray
        Degrees, 0 to 90.
    """
    length = np.hypot(
        np.asarray(difference_x, dtype=np.float64), np.asarray(difference_y, dtype=np.float64)
    )
    slope: Floats = np.degrees(np.arctan(length / difference_per_slope(detector)))
    return slope


def slope_error(slope_deg: ArrayLike, eta_0: ArrayLike, z: ArrayLike) -> Floats:
    """Relative change of eta that a slope causes: what falsifies the sum image.

    Parameters
    ----------
    slope_deg : array_like
        0 to 80.
    eta_0, z : array_like
        Backscatter coefficient at normal incidence and (mean) atomic number.

    Returns
    -------
    ndarray
        ``eta(slope) / eta(0) - 1``; 0 where `eta_0` is 0.
    """
    flat = np.asarray(eta_0, dtype=np.float64)
    tilted = tilted_eta(flat, np.asarray(z, dtype=np.float64), np.asarray(slope_deg, dtype=float))
    flat = np.broadcast_to(flat, tilted.shape)
    change: Floats = np.divide(tilted, flat, out=np.ones(tilted.shape), where=flat > 0) - 1.0
    return change
