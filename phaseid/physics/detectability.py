"""Can two phases be told apart? Contrast and the electrons it needs."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from phaseid.physics.elements import Floats

ELEMENTARY_CHARGE_C = 1.602176634e-19
ROSE_RATIO = 5.0
"""Signal difference over noise that the eye needs to see a feature (Rose 1948)."""


def contrast(first: ArrayLike, second: ArrayLike) -> Floats:
    """Contrast ``(larger - smaller) / larger``, 0 to 1; 0 where both are 0.

    The definition relative to the larger signal (Goldstein et al.); the symmetric one,
    ``(a - b) / (a + b)``, gives about half of it.
    """
    a, b = np.broadcast_arrays(
        np.asarray(first, dtype=np.float64), np.asarray(second, dtype=np.float64)
    )
    larger = np.maximum(a, b)
    value: Floats = np.divide(np.abs(a - b), larger, out=np.zeros_like(larger), where=larger > 0)
    return value


def rose_electrons(contrast_value: ArrayLike, ratio: float = ROSE_RATIO) -> Floats:
    """Signal electrons per pixel at which a contrast can just be seen: ``(ratio / C)^2``.

    Parameters
    ----------
    contrast_value : array_like
        By `contrast`.
    ratio : float
        Signal difference over noise asked for; 5 by Rose.

    Returns
    -------
    ndarray
        inf where there is no contrast.
    """
    value = np.asarray(contrast_value, dtype=np.float64)
    return np.divide(ratio**2, value**2, out=np.full_like(value, np.inf), where=value > 0)


def probe_current_pA(
    electrons: ArrayLike, eta: ArrayLike, dwell_us: ArrayLike, efficiency: ArrayLike = 1.0
) -> Floats:
    """Beam current that brings the wanted signal electrons in one dwell time.

    Parameters
    ----------
    electrons : array_like
        Signal electrons per pixel, for instance from `rose_electrons`.
    eta : array_like
        Backscatter coefficient of the brighter phase.
    dwell_us : array_like
        Time on one pixel.
    efficiency : array_like
        Detective quantum efficiency; published values start at 0.0016 for an Everhart-Thornley
        detector and reach towards 1 for large annular ones.

    Returns
    -------
    ndarray
        pA, from ``n = 6.24 I(pA) eta tau(us)`` (Goldstein et al., 4th ed., eq. 5.19) and the
        efficiency.
    """
    per_pA = 1e-12 * 1e-6 / ELEMENTARY_CHARGE_C
    current: Floats = np.asarray(electrons, dtype=np.float64) / (
        per_pA
        * np.asarray(eta, dtype=np.float64)
        * np.asarray(dwell_us, dtype=np.float64)
        * np.asarray(efficiency, dtype=np.float64)
    )
    return current
