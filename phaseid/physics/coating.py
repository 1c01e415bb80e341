"""What a conductive coat does to the signal."""

from __future__ import annotations

import numpy as np

from phaseid.physics.coats import Coat
from phaseid.physics.detector import Detector
from phaseid.physics.elements import Floats
from phaseid.physics.range_laws import kanaya_okayama_um
from phaseid.physics.stopping import mass_stopping_power

# Growth of eta with film thickness, simulated at 20 keV, against thickness over Kanaya-Okayama
# range; rows C, Al, Cu, Au.
_GROWTH_X = np.array([0.0, 0.05, 0.10, 0.20, 0.30, 0.40, 0.60])
_GROWTH_Z = np.array([6.0, 13.0, 29.0, 79.0])
_GROWTH = np.array(
    [
        [0.0, 0.13, 0.31, 0.65, 0.95, 1.00, 1.0],
        [0.0, 0.13, 0.31, 0.70, 0.94, 0.99, 1.0],
        [0.0, 0.21, 0.43, 0.82, 0.99, 1.00, 1.0],
        [0.0, 0.31, 0.58, 0.91, 0.99, 1.00, 1.0],
    ]
)


def film_growth(mean_atomic_number: float, thickness_over_range: float) -> float:
    """Backscatter coefficient of an unsupported film over that of the bulk, 0 to 1."""
    by_z = [_grown(thickness_over_range, row) for row in _GROWTH]
    return float(np.interp(np.log(mean_atomic_number), np.log(_GROWTH_Z), by_z))


def _grown(thickness_over_range: float, row: Floats) -> float:
    first, second = float(row[1]), float(row[2])
    if thickness_over_range >= _GROWTH_X[1]:
        return float(np.interp(thickness_over_range, _GROWTH_X, row))
    # The simulated curves start as powers: faster than linear for light films.
    power = max(float(np.log2(second / first)), 1.0)
    return float(first * (thickness_over_range / float(_GROWTH_X[1])) ** power)


def coat_terms(
    coat: Coat, energy_keV: float, tilt_deg: float, detector: Detector, coat_signal: float
) -> tuple[float, float]:
    """Factor and addend that turn a bare sample's signal into a coated one's.

    Parameters
    ----------
    coat : Coat
    energy_keV, tilt_deg : float
    detector : Detector
    coat_signal : float
        Signal of the coat's material as a bulk.

    Returns
    -------
    keep, add : float
        ``coated = keep * bare + add``: to first order a coat changes the grey scale only.

    Notes
    -----
    The film backscatters a share g of what its bulk would and hides the same share of the
    substrate. What passes loses energy on the way in (``t / cos tilt``) and out (``2 t``, the mean
    over a cosine law), by Joy & Luo's stopping power. The form is ours.
    """
    from phaseid.physics.averaging import mean_atomic_number

    composition = coat.mass_fractions
    path_um = coat.thickness_nm * 1e-3 / float(np.cos(np.radians(tilt_deg)))
    full_range = float(kanaya_okayama_um(composition, coat.density, energy_keV))
    growth = film_growth(float(mean_atomic_number(composition)), path_um / full_range)
    mass_nm = coat.thickness_nm * 1e-7 * coat.density
    mass_in = mass_nm / float(np.cos(np.radians(tilt_deg)))
    lost_in = mass_in * float(mass_stopping_power(composition, energy_keV))
    middle = 0.68 * energy_keV
    lost_out = 2.0 * mass_nm * float(mass_stopping_power(composition, middle))
    if detector.kind == "counting":
        kept_energy = 1.0
    else:
        usable = middle - detector.lowest_energy_keV
        kept_energy = float(np.exp(-lost_in / energy_keV - lost_out / max(usable, 0.1 * middle)))
    return (1.0 - growth) * kept_energy, growth * coat_signal


def coated(signal: Floats, terms: tuple[float, float] | None) -> Floats:
    """Apply `coat_terms` (None: no coat)."""
    if terms is None:
        return signal
    keep, add = terms
    return keep * signal + add
