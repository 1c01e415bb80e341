"""What a conductive coat does to the electrons that come back."""

from __future__ import annotations

import numpy as np

from phaseid.physics.averaging import mean_atomic_number
from phaseid.physics.coats import Coat
from phaseid.physics.elements import Floats
from phaseid.physics.range_laws import kanaya_okayama_um
from phaseid.physics.tables import on_grid, table


def hidden_share(coat: Coat, energy_keV: float, tilt_deg: float = 0.0) -> tuple[float, float]:
    """How far a coat takes the sample's signal towards the coat's own, 0 to 1.

    Parameters
    ----------
    coat : Coat
    energy_keV : float
        Beam energy.
    tilt_deg : float

    Returns
    -------
    number, energy : float
        ``eta' = eta + number (eta_coat - eta)`` for the electrons that come back, and the same
        with `energy` for the energy they carry (eta times their mean energy). The second is larger
        under a light coat, which stops few electrons but slows them all.

    Notes
    -----
    Simulated for coats from C to Au on substrates from C to Au at 5, 10 and 20 keV (see
    `phaseid.physics.tables.make`); interpolated in the coat's atomic number, its thickness along
    the beam over its Kanaya-Okayama range, and the beam energy, which matters little at a given
    ratio. Constant beyond 5 and 20 keV.
    """
    simulated = table("coats")
    composition = coat.mass_fractions
    full = float(kanaya_okayama_um(composition, coat.density, energy_keV))
    along_beam = coat.thickness_nm * 1e-3 / float(np.cos(np.radians(tilt_deg)))
    relative = simulated["thickness_over_range"]
    thickness = along_beam / full
    at = [
        np.log(energy_keV),
        np.log(float(mean_atomic_number(composition))),
        np.log(max(thickness, float(relative[0]))),
    ]
    axes = [np.log(simulated["energy_keV"]), np.log(simulated["atomic_number"]), np.log(relative)]
    shares = on_grid(simulated["hidden"], axes, [np.asarray(value) for value in at])
    # Thinner than the first simulated film the effect is in proportion to the thickness.
    shares = np.clip(shares * min(thickness / float(relative[0]), 1.0), 0.0, 1.0)
    return float(shares[0]), float(shares[1])


def coated(
    bare_eta: Floats,
    bare_carried: Floats,
    coat_eta: float,
    coat_carried: float,
    hidden: tuple[float, float],
) -> tuple[Floats, Floats]:
    """Numbers and energies that come back from under a coat.

    Parameters
    ----------
    bare_eta, bare_carried : ndarray
        Backscatter coefficient, and it times the mean energy fraction, of the bare sample.
    coat_eta, coat_carried : float
        The same of the coat's material as a bulk.
    hidden : tuple of float
        From `hidden_share`.

    Returns
    -------
    eta, carried : ndarray
    """
    number, energy = hidden
    eta = bare_eta + number * (coat_eta - bare_eta)
    carried = bare_carried + energy * (coat_carried - bare_carried)
    return eta, np.minimum(carried, eta)
