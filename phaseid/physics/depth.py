"""Where in the sample the signal comes from."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import ArrayLike

from phaseid.errors import InputError
from phaseid.physics.averaging import mean_atomic_number
from phaseid.physics.conditions import Conditions
from phaseid.physics.elements import Floats
from phaseid.physics.range_laws import kanaya_okayama_um
from phaseid.physics.signals import signal_under
from phaseid.physics.tables import on_grid, table

SHAPES = ("shallow", "half-sphere", "deep")
"""Parts of a sphere that reach a quarter, half or the whole of their visible diameter deep."""


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


def feature_fraction(
    diameter_um: ArrayLike,
    range_um_feature: ArrayLike,
    range_um_matrix: ArrayLike,
    *,
    shape: str = "half-sphere",
    over_disc: bool = False,
) -> Floats:
    """Share of a small feature's signal that is its own.

    Parameters
    ----------
    diameter_um : array_like
        Diameter seen in the image.
    range_um_feature, range_um_matrix : array_like
        Kanaya-Okayama ranges in the two materials; all three broadcast.
    shape : {"half-sphere", "shallow", "deep"}
        How far it reaches below the surface: half of, a quarter of or the whole visible diameter.
        The first is the middle case of a random section; the other two tell how much the unknown
        depth matters.
    over_disc : bool
        Mean over the whole disc instead of the centre. A region of the image with its rim eroded
        lies between the two.

    Returns
    -------
    ndarray
        f from 0 to 1: ``signal = matrix + f (feature - matrix)``. nan where a range is nan.

    Raises
    ------
    InputError
        For an unknown shape.

    Notes
    -----
    Simulated, at 10 keV, for light features in a heavy matrix where the feature has the longer
    range and heavy ones in a light matrix where it has the shorter; linear in log ratio of the ranges and
    log diameter over the shorter range. Below a tenth of the range f is in proportion to
    the diameter, as the chance of a collision inside is.
    Half a sphere of a heavy material in a light one can be up to a third brighter against its
    matrix than its bulk, as electrons leave through its flanks; f is cut at 1 all the same, because
    that depends on a shape below the surface that nobody knows.
    """
    if shape not in SHAPES:
        raise InputError(f"There is no feature shape {shape!r}; choose one of {', '.join(SHAPES)}.")
    simulated = table("features")
    feature = np.asarray(range_um_feature, dtype=np.float64)
    matrix = np.asarray(range_um_matrix, dtype=np.float64)
    size = np.asarray(diameter_um, dtype=np.float64) / np.minimum(feature, matrix)
    size, ratio = np.broadcast_arrays(size, feature / matrix)
    known = np.isfinite(size) & np.isfinite(ratio)
    smallest = float(simulated["diameter_over_shorter_range"][0])
    at = [
        np.log(np.where(known, ratio, 1.0)),
        np.log(np.maximum(np.where(known, size, 1.0), smallest)),
    ]
    axes = [np.log(simulated["ratio"]), np.log(simulated["diameter_over_shorter_range"])]
    shares = simulated["share"][:, :, SHAPES.index(shape), int(over_disc)]
    fraction = on_grid(shares, axes, at) * np.minimum(size / smallest, 1.0)
    return np.where(known, np.clip(fraction, 0.0, 1.0), np.nan)


def smallest_feature_um(
    range_um_feature: ArrayLike,
    range_um_matrix: ArrayLike,
    fraction: float = 0.9,
    *,
    shape: str = "half-sphere",
    over_disc: bool = False,
) -> Floats:
    """Diameter from which at least `fraction` of a feature's signal is its own.

    Parameters
    ----------
    range_um_feature, range_um_matrix : array_like
    fraction : float
        0 to 1; 0.9 unless stated.
    shape, over_disc
        As for `feature_fraction`.

    Returns
    -------
    ndarray
        um; inf where even a feature of four ranges does not reach the fraction.
    """
    feature, matrix = np.broadcast_arrays(
        np.asarray(range_um_feature, dtype=np.float64),
        np.asarray(range_um_matrix, dtype=np.float64),
    )
    sizes = np.geomspace(0.02, 4.0, 240)
    shorter = np.minimum(feature, matrix)
    shares = feature_fraction(
        sizes * shorter[..., None],
        feature[..., None],
        matrix[..., None],
        shape=shape,
        over_disc=over_disc,
    )
    reached = shares >= fraction
    first = np.argmax(reached, axis=-1)
    return np.where(reached.any(axis=-1), sizes[first] * shorter, np.inf)


def highest_energy_keV(
    diameter_um: ArrayLike, range_um_at_20_keV: ArrayLike, fraction: float = 0.9
) -> Floats:
    """Beam energy below which a feature of the given size can be judged by its own signal.

    Parameters
    ----------
    diameter_um : array_like
    range_um_at_20_keV : array_like
        Kanaya-Okayama range in the feature at 20 keV.
    fraction : float
        As for `smallest_feature_um`; the matrix is taken to have the same range.

    Returns
    -------
    ndarray
        keV, from the range's growth with the power 1.67 of the energy. Below about 5 keV the
        prediction itself is not reliable.
    """
    needed = float(smallest_feature_um(1.0, 1.0, fraction))
    wanted = np.asarray(diameter_um, dtype=np.float64) / needed
    energy: Floats = 20.0 * (wanted / np.asarray(range_um_at_20_keV, dtype=np.float64)) ** (
        1 / 1.67
    )
    return energy


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
