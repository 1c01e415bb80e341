"""What a simulation found: the electrons that came back, and the numbers drawn from them."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike

from phaseid.physics.detector import Detector
from phaseid.physics.elements import Floats
from phaseid.physics.scattering import Floats32
from phaseid.physics.stepping import Start


@dataclass(frozen=True, eq=False)
class Exits:
    """Backscattered electrons of one simulation.

    Attributes
    ----------
    electrons : int
        Electrons sent in.
    start : Start
        How they arrived.
    energy_keV : ndarray of float32, shape (backscattered,)
        Energy on leaving.
    direction : ndarray of float32, shape (3, backscattered)
        Unit vector of flight; the third component is negative.
    position_um : ndarray of float32, shape (2, backscattered)
        Where they left the surface.
    depth_um : ndarray of float32, shape (backscattered,)
        Greatest depth each had reached.
    complete : bool
        False when it was stopped early; `electrons` then counts those that were followed.
    """

    electrons: int
    start: Start
    energy_keV: Floats32
    direction: Floats32
    position_um: Floats32
    depth_um: Floats32
    complete: bool = True

    @property
    def eta(self) -> float:
        """Backscatter coefficient; nan when nothing was followed."""
        return len(self.energy_keV) / self.electrons if self.electrons else float("nan")

    @property
    def eta_se(self) -> float:
        """Standard error of `eta` (binomial)."""
        if not self.electrons:
            return float("nan")
        return float(np.sqrt(self.eta * (1 - self.eta) / self.electrons))

    @property
    def energy_fraction(self) -> Floats:
        """Energy on leaving over the beam energy, shape (backscattered,)."""
        fraction: Floats = self.energy_keV.astype(np.float64) / self.start.energy_keV
        return fraction

    @property
    def mean_energy_fraction(self) -> float:
        """Mean of `energy_fraction`; nan when none came back."""
        return float(self.energy_fraction.mean()) if len(self.energy_keV) else float("nan")

    @cached_property
    def radius_um(self) -> Floats:
        """Distance between the beam's point of impact and each exit."""
        x, y = self.position_um.astype(np.float64)
        radius: Floats = np.hypot(x - self.start.position_um[0], y - self.start.position_um[1])
        return radius

    @property
    def exit_angle_deg(self) -> Floats:
        """Angle between each direction of flight and the surface normal, 0 to 90."""
        upwards = np.clip(-self.direction[2].astype(np.float64), 0.0, 1.0)
        angle: Floats = np.degrees(np.arccos(upwards))
        return angle

    @property
    def beam_angle_deg(self) -> Floats:
        """Angle between each direction of flight and the way back to the gun, 0 to 180."""
        tilt = np.radians(self.start.tilt_deg)
        ux, _, uz = self.direction.astype(np.float64)
        back = np.clip(-(ux * np.sin(tilt) + uz * np.cos(tilt)), -1.0, 1.0)
        angle: Floats = np.degrees(np.arccos(back))
        return angle

    def energy_spectrum(self, bins: int = 50) -> tuple[Floats, Floats]:
        """Electrons per incident electron and unit of E/E0.

        Returns
        -------
        edges : ndarray of shape (bins + 1,)
            E/E0 from 0 to 1.
        density : ndarray of shape (bins,)
            Integrates to `eta`.
        """
        return self._density(self.energy_fraction, np.linspace(0.0, 1.0, bins + 1))

    def angle_spectrum(self, bins: int = 45) -> tuple[Floats, Floats]:
        """Electrons per incident electron and degree of exit angle; as `energy_spectrum`."""
        return self._density(self.exit_angle_deg, np.linspace(0.0, 90.0, bins + 1))

    def depth_quantile_um(self, share: ArrayLike) -> Floats:
        """Depth that the given share of the backscattered electrons stayed above."""
        return self._quantile(self.depth_um, share)

    def radius_quantile_um(self, share: ArrayLike) -> Floats:
        """Radius within which the given share of them left."""
        return self._quantile(self.radius_um, share)

    def signal(self, detector: Detector | None = None) -> tuple[float, float]:
        """Signal of an annular detector facing the beam.

        Parameters
        ----------
        detector : Detector or None
            Its angles are measured at the point of impact from the beam axis.

        Returns
        -------
        signal, standard_error : float
            Per incident electron, in units of the beam energy (``"counting"``: electrons).
        """
        chosen = detector or Detector()
        unit = 1.0 if chosen.kind == "counting" else self.start.energy_keV
        share = chosen.response(self.energy_keV) / unit
        if (chosen.inner_angle_deg, chosen.outer_angle_deg) != (0.0, 90.0):
            angle = self.beam_angle_deg
            share = share * ((angle >= chosen.inner_angle_deg) & (angle < chosen.outer_angle_deg))
        return self._mean_per_electron(share)

    def quadrants(self, detector: Detector | None = None) -> Floats:
        """Signals of a detector divided into four, shape (4,).

        The quadrants look towards +x, +y, -x and -y; their sum is `signal`. On a surface that
        leans away from +x more electrons leave towards +x.
        """
        chosen = detector or Detector()
        unit = 1.0 if chosen.kind == "counting" else self.start.energy_keV
        share = chosen.response(self.energy_keV) / unit
        angle = self.beam_angle_deg
        if (chosen.inner_angle_deg, chosen.outer_angle_deg) != (0.0, 90.0):
            share = share * ((angle >= chosen.inner_angle_deg) & (angle < chosen.outer_angle_deg))
        tilt = np.radians(self.start.tilt_deg)
        ux, uy, uz = self.direction.astype(np.float64)
        sideways = ux * np.cos(tilt) - uz * np.sin(tilt)
        quadrant = np.round(np.arctan2(uy, sideways) / (np.pi / 2)).astype(int) % 4
        sums: Floats = np.bincount(quadrant, weights=share, minlength=4) / max(self.electrons, 1)
        return sums

    def _mean_per_electron(self, share: Floats) -> tuple[float, float]:
        if not self.electrons:
            return float("nan"), float("nan")
        mean = float(share.sum()) / self.electrons
        variance = float((share**2).sum()) / self.electrons - mean**2
        return mean, float(np.sqrt(max(variance, 0.0) / self.electrons))

    def _density(self, values: Floats, edges: Floats) -> tuple[Floats, Floats]:
        counts, _ = np.histogram(values, edges)
        density: Floats = counts / (max(self.electrons, 1) * np.diff(edges))
        return edges, density

    def _quantile(self, values: Floats | Floats32, share: ArrayLike) -> Floats:
        shares = np.asarray(share, dtype=np.float64)
        if not len(values):
            return np.full(shares.shape, np.nan)
        quantile: Floats = np.asarray(np.quantile(values.astype(np.float64), shares))
        return quantile
