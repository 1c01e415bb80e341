"""Can two phases be told apart? Contrast and the electrons it needs."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from phaseid.physics.conditions import Conditions
from phaseid.physics.depth import information_depth_um, lateral_radius_um
from phaseid.physics.detector import Detector
from phaseid.physics.elements import Floats, as_compositions
from phaseid.physics.model_error import SIGNAL_SHIFT, ModelError, model_error
from phaseid.physics.signals import signal_under

ELEMENTARY_CHARGE_C = 1.602176634e-19
ROSE_RATIO = 5.0
"""Signal difference over noise that the eye needs to see a feature (Rose 1948)."""

_ANY = Detector("ideal")


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


@dataclass(frozen=True, eq=False)
class Separation:
    """Which of P phases can be told apart in pairs, at E beam energies and T tilts.

    Attributes
    ----------
    energies_keV : ndarray of shape (E,)
    tilts_deg : ndarray of shape (T,)
    signal : ndarray of shape (E, T, P)
        Predicted signal of each phase; nan where the detector sees nothing.
    contrast : ndarray of shape (E, T, P, P)
        By `contrast`.
    electrons : ndarray of shape (E, T, P, P)
        Signal electrons per pixel, or per region mean, by the Rose criterion; inf for no contrast.
    noise_ratio : ndarray of shape (E, T, P, P)
        Difference of two region means over its standard deviation from noise alone; nan when no
        noise was given.
    model_ratio : ndarray of shape (E, T, P, P)
        Logarithm of the predicted ratio over the standard deviation the model's error gives it:
        below about 2 the grey levels may differ, but which phase is the brighter one cannot be
        said without a known phase.
    resolution_um : ndarray of shape (E, P, P)
        Distance over which a boundary between the two phases is blurred: the sum of the radii that
        90 % of the electrons keep to on either side. nan where a density is missing.
    depth_um : ndarray of shape (E, P)
        Information depth of each phase; nan where its density is missing.
    """

    energies_keV: Floats
    tilts_deg: Floats
    signal: Floats
    contrast: Floats
    electrons: Floats
    noise_ratio: Floats
    model_ratio: Floats
    resolution_um: Floats
    depth_um: Floats

    def visible(self, ratio: float = ROSE_RATIO) -> NDArray[np.bool_]:
        """Pairs whose difference exceeds the noise `ratio` times, shape (E, T, P, P)."""
        seen: NDArray[np.bool_] = np.nan_to_num(self.noise_ratio) >= ratio
        return seen

    def best_energy(self, resolution_um: float = np.inf) -> NDArray[np.intp]:
        """Index of the energy with the largest contrast of each pair, shape (T, P, P).

        Energies that blur a boundary over more than `resolution_um` are left out; -1 where none
        is left or there is no contrast at all.
        """
        fits = np.isinf(resolution_um) | (self.resolution_um <= resolution_um)
        usable = np.where(fits[:, None], np.nan_to_num(self.contrast), 0.0)
        best = np.argmax(usable, axis=0)
        return np.where(usable.max(axis=0) > 0, best, -1)


def separate(
    mass_fractions: ArrayLike,
    density: ArrayLike | None = None,
    *,
    energies_keV: ArrayLike = (5.0, 10.0, 15.0, 20.0, 25.0, 30.0),
    tilts_deg: ArrayLike = (0.0,),
    conditions: Conditions | None = None,
    noise: float | None = None,
    pixels: ArrayLike = 1.0,
    ratio: float = ROSE_RATIO,
) -> Separation:
    """Work out which phases can be told apart, and at what price.

    Parameters
    ----------
    mass_fractions : array_like of shape (P, 103)
    density : array_like of shape (P,), optional
        g/cm3, nan where it is not known.
    energies_keV, tilts_deg : array_like
        Beam energies and tilts to compare.
    conditions : Conditions or None
        Detector, coat, model and rule; its energy and tilt are replaced in turn.
    noise : float, optional
        Standard deviation of one pixel over the mean grey above the dark level, at the brighter
        phase of the pair.
    pixels : array_like
        Pixels averaged in each region, broadcast against (E, T, P, P).
    ratio : float
        Difference over noise that `electrons` asks for.

    Returns
    -------
    Separation

    Raises
    ------
    InputError
        For energies or tilts out of bounds.
    """
    composition = np.atleast_2d(as_compositions(mass_fractions))
    count = len(composition)
    known = np.full(count, np.nan) if density is None else np.asarray(density, dtype=np.float64)
    energies = np.atleast_1d(np.asarray(energies_keV, dtype=np.float64))
    tilts = np.atleast_1d(np.asarray(tilts_deg, dtype=np.float64))
    base = conditions or Conditions()
    signal = np.full((len(energies), len(tilts), count), np.nan)
    model_ratio = np.full((len(energies), len(tilts), count, count), np.nan)
    for e, energy in enumerate(energies):
        for t, tilt in enumerate(tilts):
            bounds = replace(base, energy_keV=float(energy), tilt_deg=float(tilt), detector=_ANY)
            if base.detector.lowest_energy_keV >= energy:
                continue
            under = replace(bounds, detector=base.detector)
            signal[e, t] = signal_under(composition, under)
            model_ratio[e, t] = _model_ratio(signal[e, t], model_error(composition, under))
    pair = contrast(signal[..., :, None], signal[..., None, :])
    by_noise = np.full(pair.shape, np.nan)
    if noise is not None and noise > 0:
        by_noise = pair / (noise * np.sqrt(2.0 / np.asarray(pixels, dtype=np.float64)))
    radius = lateral_radius_um(composition, known, energies[:, None])
    return Separation(
        energies_keV=energies,
        tilts_deg=tilts,
        signal=signal,
        contrast=pair,
        electrons=rose_electrons(pair, ratio),
        noise_ratio=by_noise,
        model_ratio=model_ratio,
        resolution_um=radius[:, :, None] + radius[:, None, :],
        depth_um=information_depth_um(composition, known, energies[:, None]),
    )


def _model_ratio(signal: Floats, error: ModelError) -> Floats:
    """Difference of each two signals over the standard deviation the model's error gives it.

    In logarithms, so that the gain, which is free, drops out: what is left of the smooth part is
    how far it can drift between the two signals.
    """
    # Vacuum has no logarithm, and nothing is in doubt about it either.
    floor = np.maximum(signal, 1e-9)
    apart = np.subtract.outer(np.log(signal + SIGNAL_SHIFT), np.log(signal + SIGNAL_SHIFT))
    drift = 2 * error.relative_sd**2 * (1 - np.exp(-0.5 * (apart / error.length) ** 2))
    own = (error.own_sd / floor) ** 2
    sd = np.sqrt(drift + own[:, None] + own[None, :])
    difference = np.abs(np.subtract.outer(np.log(floor), np.log(floor)))
    return np.divide(difference, sd, out=np.zeros_like(sd), where=sd > 1e-12)
