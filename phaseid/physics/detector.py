"""Backscatter detectors: what an electron of a given energy adds to the grey level."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from phaseid.errors import InputError
from phaseid.physics.elements import Floats

_DEFAULT_THRESHOLD_KEV = {"solid-state": 2.0, "scintillator": 4.0, "ideal": 0.0, "counting": 0.0}


@dataclass(frozen=True)
class Detector:
    """A backscatter detector.

    Parameters
    ----------
    kind : {"solid-state", "scintillator", "ideal", "counting"}
        The first three answer in proportion to the energy above the threshold; ``"counting"``
        answers equally to every electron above it.
    threshold_keV : float or None
        Energy lost in the dead layer or metal film before anything is counted. None takes the
        kind's usual value: 2 keV for a solid-state detector and 4 keV for a metallised scintillator
        (from memory; makers differ, thin-window diodes reach below 1 keV).
    inner_angle_deg, outer_angle_deg : float
        Annulus seen from the beam's point of impact, measured from the beam axis. 0 to 90 takes
        every electron and is the default because the angular emission is nearly the same for all
        phases at normal incidence.

    Raises
    ------
    InputError
        For an unknown kind, a negative threshold or angles out of order.
    """

    kind: str = "solid-state"
    threshold_keV: float | None = None
    inner_angle_deg: float = 0.0
    outer_angle_deg: float = 90.0

    def __post_init__(self) -> None:
        if self.kind not in _DEFAULT_THRESHOLD_KEV:
            raise InputError(
                f"There is no detector kind {self.kind!r}; choose one of "
                f"{', '.join(_DEFAULT_THRESHOLD_KEV)}."
            )
        if self.threshold_keV is not None and not 0 <= self.threshold_keV < 100:
            raise InputError(
                f"A detector threshold of {self.threshold_keV:g} keV cannot be used; give a value "
                "from 0 up to the beam energy."
            )
        if not 0 <= self.inner_angle_deg < self.outer_angle_deg <= 90:
            raise InputError(
                f"A detector from {self.inner_angle_deg:g} to {self.outer_angle_deg:g} degrees "
                "cannot be used; the inner angle must be smaller than the outer, both 0 to 90."
            )

    @property
    def lowest_energy_keV(self) -> float:
        """Energy below which an electron leaves no signal."""
        if self.threshold_keV is None:
            return _DEFAULT_THRESHOLD_KEV[self.kind]
        return self.threshold_keV

    def response(self, energy_keV: ArrayLike) -> Floats:
        """Signal of one electron, in keV (``"counting"``: 0 or 1)."""
        energy = np.asarray(energy_keV, dtype=np.float64)
        above = energy - self.lowest_energy_keV
        value: Floats = (above > 0).astype(float) if self.kind == "counting" else above.clip(0.0)
        return value

    def mean_response(self, mean_energy_fraction: ArrayLike, energy_keV: float) -> Floats:
        """Mean signal per backscattered electron as a fraction of the beam energy.

        Parameters
        ----------
        mean_energy_fraction : array_like
            Mean energy of the backscattered electrons over the beam energy, W.
        energy_keV : float
            Beam energy.

        Returns
        -------
        ndarray
            For ``"counting"`` the fraction of the electrons above the threshold.

        Notes
        -----
        Electrons below the threshold count for nothing, not negatively, so the spread of energies
        matters. It is taken as ``p w^(p-1)`` on 0..1 with the mean W, p = W / (1 - W), whose
        average response is ``W - t + (1 - W) t^(p+1)`` with t the threshold over the beam energy.
        The form is ours; the tests compare it with the simulated distributions.
        """
        mean = np.clip(np.asarray(mean_energy_fraction, dtype=np.float64), 1e-3, 1 - 1e-3)
        share = min(self.lowest_energy_keV / energy_keV, 1.0)
        power = mean / (1.0 - mean)
        if self.kind == "counting":
            counted: Floats = 1.0 - share**power
            return counted
        value: Floats = mean - share + (1.0 - mean) * share ** (power + 1.0)
        return value
