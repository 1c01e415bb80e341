"""What the detector sees: energies of the backscattered electrons, detector signal, its error."""

from __future__ import annotations

from phaseid.physics.detector import Detector
from phaseid.physics.model_error import SIGNAL_SHIFT, ModelError, model_error
from phaseid.physics.signals import (
    mean_energy_fraction,
    mean_energy_keV,
    signal,
    signal_ensemble,
    signal_under,
)

__all__ = [
    "SIGNAL_SHIFT",
    "Detector",
    "ModelError",
    "mean_energy_fraction",
    "mean_energy_keV",
    "model_error",
    "signal",
    "signal_ensemble",
    "signal_under",
]
