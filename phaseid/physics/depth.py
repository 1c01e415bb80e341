"""Where in the sample the signal comes from."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import ArrayLike

from phaseid.errors import InputError
from phaseid.physics.averaging import mean_atomic_number
from phaseid.physics.conditions import Conditions
from phaseid.physics.elements import Floats
from phaseid.physics.range_laws import kanaya_okayama_um
from phaseid.physics.signals import signal_under

# Simulated at 10 and 20 keV, in units of the Kanaya-Okayama range: the depth that 50, 90 and 95 %
# of the backscattered electrons stay above, and the radius 50 and 90 % leave within.
_Z = np.array([6.0, 13.0, 26.0, 29.0, 47.0, 79.0])
_DEPTH = {
    0.5: np.array([0.16, 0.15, 0.12, 0.12, 0.10, 0.09]),
    0.9: np.array([0.28, 0.27, 0.24, 0.23, 0.21, 0.20]),
    0.95: np.array([0.31, 0.30, 0.26, 0.25, 0.24, 0.23]),
}
_RADIUS = {
    0.5: np.array([0.24, 0.22, 0.17, 0.16, 0.13, 0.11]),
    0.9: np.array([0.50, 0.46, 0.38, 0.38, 0.33, 0.30]),
}


def electron_range_um(
    mass_fractions: ArrayLike, density: ArrayLike, energy_keV: ArrayLike = 20.0
) -> Floats:
    """Electron range (Kanaya & Okayama 1972) in um; see `range_laws.kanaya_okayama_um`."""
    return kanaya_okayama_um(mass_fractions, density, energy_keV)


def information_depth_um(
    mass_fractions: ArrayLike,
    density: ArrayLike,
    energy_keV: ArrayLike = 20.0,
    share: float = 0.95,
) -> Floats:
    """Depth that a given share of the backscattered electrons stays above.

    Parameters
    ----------
    mass_fractions : array_like of shape (..., 103)
    density : array_like
        g/cm3, nan where it is not known.
    energy_keV : array_like
    share : {0.5, 0.9, 0.95}

    Returns
    -------
    ndarray
        um at normal incidence, nan where the density is nan. A simulated fraction of the electron
        range, 0.31 for carbon to 0.23 for gold at the default share; the rule of thumb "half the
        range" is an upper bound.
    """
    fraction = _fraction(mass_fractions, _DEPTH, share)
    return fraction * kanaya_okayama_um(mass_fractions, density, energy_keV)


def lateral_radius_um(
    mass_fractions: ArrayLike,
    density: ArrayLike,
    energy_keV: ArrayLike = 20.0,
    share: float = 0.9,
) -> Floats:
    """Radius about the beam within which a given share of the electrons leaves again.

    Parameters
    ----------
    mass_fractions, density, energy_keV
        As for `information_depth_um`.
    share : {0.5, 0.9}

    Returns
    -------
    ndarray
        um, nan where the density is nan. Pixels closer than this to a boundary are blends.
    """
    fraction = _fraction(mass_fractions, _RADIUS, share)
    return fraction * kanaya_okayama_um(mass_fractions, density, energy_keV)


def coat_factor(mass_fractions: ArrayLike, conditions: Conditions) -> Floats:
    """Signal with the coat of `conditions` over that without, shape (...); 1 without a coat."""
    bare = signal_under(mass_fractions, replace(conditions, coat=None))
    with_coat = signal_under(mass_fractions, conditions)
    return np.divide(with_coat, bare, out=np.full_like(bare, np.inf), where=bare > 0)


def feature_fraction(
    diameter_um: ArrayLike, range_um_feature: ArrayLike, range_um_matrix: ArrayLike
) -> Floats:
    """Share of the signal at the centre of a small feature that comes from the feature.

    Parameters
    ----------
    diameter_um : array_like
        Diameter seen in the image.
    range_um_feature, range_um_matrix : array_like
        Electron ranges in the two materials.

    Returns
    -------
    ndarray
        0..1: ``signal = matrix + fraction (feature - matrix)``.

    Notes
    -----
    The feature is taken as the lower half of a sphere cut at its equator. Depth and radius that
    the electrons need are close to 0.3 and 0.4 of the range; the share of paths that stay inside
    is taken as ``(1 - exp(-(d / a)^2))`` with ``a = 0.45`` mean ranges.
    """
    feature = np.asarray(range_um_feature, dtype=np.float64)
    matrix = np.asarray(range_um_matrix, dtype=np.float64)
    size = np.asarray(diameter_um, dtype=np.float64) / (0.45 * np.sqrt(feature * matrix))
    share: Floats = 1.0 - np.exp(-(size**2))
    return share


def _fraction(mass_fractions: ArrayLike, table: dict[float, Floats], share: float) -> Floats:
    if share not in table:
        shares = ", ".join(f"{known:g}" for known in table)
        raise InputError(f"A share of {share:g} is not tabulated; choose one of {shares}.")
    z = mean_atomic_number(mass_fractions)
    fraction: Floats = np.interp(np.log(z), np.log(_Z), table[share])
    return fraction
