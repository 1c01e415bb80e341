"""Where in the sample the signal comes from."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import ArrayLike

from phaseid.errors import InputError
from phaseid.physics.averaging import mean_atomic_number
from phaseid.physics.conditions import Conditions
from phaseid.physics.elements import Floats
from phaseid.physics.features import (
    SHAPES,
    feature_fraction,
    feature_relief,
    feature_signal,
    feature_signal_sd,
    highest_energy_keV,
    smallest_feature_um,
)
from phaseid.physics.range_laws import kanaya_okayama_um
from phaseid.physics.signals import signal_under
from phaseid.physics.tables import on_grid, table

__all__ = [
    "SHAPES",
    "coat_factor",
    "electron_range_um",
    "feature_fraction",
    "feature_relief",
    "feature_signal",
    "feature_signal_sd",
    "highest_energy_keV",
    "information_depth_um",
    "lateral_radius_um",
    "smallest_feature_um",
]


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
    share : float
        0.5 to 0.99.

    Returns
    -------
    ndarray
        um at normal incidence, nan where the density is nan. A simulated fraction of the electron
        range, 0.32 for carbon to 0.23 for gold at 20 keV and the default share; the rule of thumb
        "half the range" is an upper bound.
    """
    return _fraction(mass_fractions, density, energy_keV, share, "depth")


def lateral_radius_um(
    mass_fractions: ArrayLike,
    density: ArrayLike,
    energy_keV: ArrayLike = 20.0,
    share: float = 0.9,
) -> Floats:
    """Radius about the beam within which a given share of the electrons leaves again.

    Parameters
    ----------
    mass_fractions, density, energy_keV, share
        As for `information_depth_um`.

    Returns
    -------
    ndarray
        um, nan where the density is nan. Pixels closer than this to a boundary are blends.
    """
    return _fraction(mass_fractions, density, energy_keV, share, "radius")


def coat_factor(mass_fractions: ArrayLike, conditions: Conditions) -> Floats:
    """Signal with the coat of `conditions` over that without, shape (...); 1 without a coat."""
    bare = signal_under(mass_fractions, replace(conditions, coat=None))
    with_coat = signal_under(mass_fractions, conditions)
    return np.divide(with_coat, bare, out=np.full_like(bare, np.inf), where=bare > 0)


def _fraction(
    mass_fractions: ArrayLike, density: ArrayLike, energy_keV: ArrayLike, share: float, what: str
) -> Floats:
    simulated = table("depths")
    shares = simulated["share"]
    if not shares[0] <= share <= shares[-1]:
        raise InputError(
            f"A share of {share:g} is not tabulated; give one from {shares[0]:g} to {shares[-1]:g}."
        )
    full = kanaya_okayama_um(mass_fractions, density, energy_keV)
    z, energy = np.broadcast_arrays(
        np.log(mean_atomic_number(mass_fractions)), np.log(np.asarray(energy_keV, dtype=float))
    )
    axes = [np.log(simulated["energy_keV"]), np.log(simulated["atomic_number"]), shares]
    at = [energy, z, np.full(z.shape, share)]
    fraction: Floats = full * on_grid(simulated[what], axes, at)
    return fraction
