"""The backscatter coefficient eta: models, compound rules, tilt, and how far they agree."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from phaseid.physics.elemental import (
    DEFAULT_MODEL,
    BackscatterModel,
    elemental_eta,
    get_model,
    models,
)
from phaseid.physics.elements import Floats
from phaseid.physics.mixing import (
    DEFAULT_RULE,
    CompoundRule,
    compound_rules,
    defensible_rules,
    get_rule,
)
from phaseid.physics.signals import eta, eta_ensemble
from phaseid.physics.tilting import DEFAULT_TILT_LAW, TiltLaw, tilt_laws

__all__ = [
    "DEFAULT_MODEL",
    "DEFAULT_RULE",
    "DEFAULT_TILT_LAW",
    "BackscatterModel",
    "CompoundRule",
    "TiltLaw",
    "compound_rules",
    "defensible_rules",
    "elemental_eta",
    "eta",
    "eta_ensemble",
    "eta_sd",
    "get_model",
    "get_rule",
    "laboratory_sd",
    "models",
    "tilt_laws",
]

# Spread of laboratory means of one element about the common trend, C, Al, Si, Cu, Au: no formula
# can be known better than that.
_LABORATORY_Z = np.array([6.0, 13.0, 14.0, 29.0, 79.0])
_LABORATORY_SD = np.array([0.13, 0.10, 0.07, 0.07, 0.03])


def laboratory_sd(eta_value: ArrayLike) -> Floats:
    """Relative spread between laboratories at a given eta, from 13 % (carbon) to 3 % (gold).

    Found from 219 measured values of five elements; interpolated in eta, constant outside.
    """
    at = elemental_eta(_LABORATORY_Z, 20.0)
    spread: Floats = np.interp(np.asarray(eta_value, dtype=np.float64), at, _LABORATORY_SD)
    return spread


def eta_sd(mass_fractions: ArrayLike, energy_keV: float = 20.0, tilt_deg: float = 0.0) -> Floats:
    """Standard deviation of what can be defended for eta.

    Parameters
    ----------
    mass_fractions : array_like of shape (..., 103)
    energy_keV, tilt_deg : float

    Returns
    -------
    ndarray of shape (...)
        The larger of two: the spread over every confirmed model and defensible compound rule, and
        the spread between laboratories. They are not added, as the formulas were fitted to the
        laboratories' values. For differences between phases use `phaseid.physics.energy.model_error`:
        most of this spread is common to neighbouring phases.
    """
    values, _ = eta_ensemble(mass_fractions, energy_keV, tilt_deg)
    middle = eta(mass_fractions, energy_keV, tilt_deg)
    sd: Floats = np.maximum(values.std(axis=0), laboratory_sd(middle) * middle)
    return sd
