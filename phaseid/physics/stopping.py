"""Energy that electrons lose along their way (continuous slowing down)."""

from __future__ import annotations

from functools import cache

import numpy as np
from numpy.typing import ArrayLike

from phaseid.physics.elements import (
    Floats,
    as_compositions,
    atomic_masses,
    atomic_numbers,
    mean_ionisation_keV,
)

# k of Joy & Luo's modified ionisation energy where they print one, by atomic number.
_PRINTED_K = {6: 0.77, 13: 0.815, 14: 0.822, 28: 0.83, 29: 0.83, 47: 0.852, 79: 0.851}


@cache
def joy_luo_k() -> Floats:
    """Factor k of Joy & Luo for each element, shape (103,).

    The printed values where there are any, else ``0.7307 + 0.0299 ln Z``.
    """
    k = 0.7307 + 0.0299 * np.log(atomic_numbers())
    for z, value in _PRINTED_K.items():
        k[z - 1] = value
    k.flags.writeable = False
    return k


def mass_stopping_power(mass_fractions: ArrayLike, energy_keV: ArrayLike) -> Floats:
    """Energy lost per mass thickness.

    Parameters
    ----------
    mass_fractions : array_like of shape (..., 103)
    energy_keV : array_like
        Broadcast against the compositions' shape.

    Returns
    -------
    ndarray
        ``-dE/d(rho s)`` in keV per g/cm2, summed over the elements by mass fraction.

    References
    ----------
    Joy & Luo 1989: ``78500 Z / (A E) ln(1.166 (E + k J) / J)``, J of Berger & Seltzer 1964.
    """
    composition = as_compositions(mass_fractions)
    energy = np.asarray(energy_keV, dtype=np.float64)[..., None]
    ionisation = mean_ionisation_keV()
    argument = 1.166 * (energy + joy_luo_k() * ionisation) / ionisation
    # k J / J * 1.166 falls below 1 for a few light elements: no gain of energy at the very end.
    logarithm = np.log(np.maximum(argument, 1.0 + 1e-6))
    per_element = 78500.0 * atomic_numbers() / atomic_masses() / energy * logarithm
    stopping: Floats = (composition * per_element).sum(axis=-1)
    return stopping
