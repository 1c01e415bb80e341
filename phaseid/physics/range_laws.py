"""How far electrons travel in a material."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from phaseid.physics.elements import Floats, as_compositions, atomic_masses, atomic_numbers


def kanaya_okayama_um(
    mass_fractions: ArrayLike, density: ArrayLike, energy_keV: ArrayLike = 20.0
) -> Floats:
    """Electron range of Kanaya and Okayama.

    Parameters
    ----------
    mass_fractions : array_like of shape (..., 103)
    density : array_like
        g/cm3; nan where it is not known.
    energy_keV : array_like

    Returns
    -------
    ndarray
        Range in um: ``0.0276 A E^1.67 / (Z^0.89 rho)`` for an element, and for a compound
        ``1/R = sum c_i/R_i`` with its own density. nan where the density is not known or not
        positive, and for an empty composition.

    References
    ----------
    Kanaya & Okayama 1972; harmonic weighting as in later practice.
    """
    inverse = as_compositions(mass_fractions) @ (atomic_numbers() ** 0.89 / atomic_masses())
    energy = np.asarray(energy_keV, dtype=np.float64)
    stopping = inverse * np.asarray(density, dtype=np.float64)
    # An empty composition has no range, rather than an infinite one.
    full_range: Floats = 0.0276 * energy**1.67 / np.where(stopping > 0, stopping, np.nan)
    return full_range
