"""Features smaller than the electrons' reach: what of their signal is their own."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from phaseid.errors import InputError
from phaseid.physics.elements import Floats
from phaseid.physics.tables import on_grid, table

SHAPES = ("shallow", "half-sphere", "deep")
"""Parts of a sphere that reach a quarter, half or the whole of their visible diameter deep."""


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
        f from 0 to 1: ``signal = (matrix + f (feature - matrix)) (1 + relief)``, with the relief
        from `feature_relief`. nan where a range is nan.

    Raises
    ------
    InputError
        For an unknown shape.

    Notes
    -----
    Simulated at 10 keV (see `phaseid.physics.tables.make`); linear in log ratio of the ranges and
    log diameter over the shorter range. Below a tenth of the range f is in proportion to the
    diameter, as the chance of a collision inside is.
    """
    fraction = _of_feature(
        "share", diameter_um, range_um_feature, range_um_matrix, shape, over_disc=over_disc
    )
    return np.clip(fraction, 0.0, 1.0)


def feature_relief(
    diameter_um: ArrayLike,
    range_um_feature: ArrayLike,
    range_um_matrix: ArrayLike,
    *,
    shape: str = "half-sphere",
    over_disc: bool = False,
) -> Floats:
    """Relative change of a small feature's signal by its density alone.

    To the electrons a feature looser than its matrix is a pit, whose walls keep them in, and a
    denser one a bump, whose flanks let them out. Manganese sulphide in steel shows darker at half
    a micrometre than at ten.

    Parameters
    ----------
    diameter_um, range_um_feature, range_um_matrix, shape, over_disc
        As for `feature_fraction`. The longer range is taken to belong to the looser material.

    Returns
    -------
    ndarray
        Negative for a loose feature, positive for a dense one, 0 for large ones.
    """
    return _of_feature(
        "relief", diameter_um, range_um_feature, range_um_matrix, shape, over_disc=over_disc
    )


def feature_signal(
    signal_feature: ArrayLike,
    signal_matrix: ArrayLike,
    diameter_um: ArrayLike,
    range_um_feature: ArrayLike,
    range_um_matrix: ArrayLike,
    *,
    shape: str = "half-sphere",
    over_disc: bool = False,
) -> Floats:
    """Signal of a small feature in a matrix from the signals of the two as bulk.

    Parameters
    ----------
    signal_feature, signal_matrix : array_like
        By `phaseid.physics.energy.signal`.
    diameter_um, range_um_feature, range_um_matrix, shape, over_disc
        As for `feature_fraction`.

    Returns
    -------
    ndarray
        In the units of the signals; nan where a range is nan.
    """
    matrix = np.asarray(signal_matrix, dtype=np.float64)
    size = (diameter_um, range_um_feature, range_um_matrix)
    fraction = feature_fraction(*size, shape=shape, over_disc=over_disc)
    relief = feature_relief(*size, shape=shape, over_disc=over_disc)
    blend = matrix + fraction * (np.asarray(signal_feature, dtype=np.float64) - matrix)
    seen: Floats = blend * (1.0 + relief)
    return seen


def feature_signal_sd(
    signal_feature: ArrayLike,
    signal_matrix: ArrayLike,
    diameter_um: ArrayLike,
    range_um_feature: ArrayLike,
    range_um_matrix: ArrayLike,
    *,
    over_disc: bool = False,
) -> Floats:
    """Standard deviation of `feature_signal` from what is not known of a feature.

    Parameters
    ----------
    signal_feature, signal_matrix, diameter_um, range_um_feature, range_um_matrix, over_disc
        As for `feature_signal`.

    Returns
    -------
    ndarray
        In the units of the signals: the spread over the three depths of `SHAPES`, and half of what
        light-in-heavy and heavy-in-light features disagree by in the table, in quadrature.
    """
    size = (diameter_um, range_um_feature, range_um_matrix)
    by_shape = [
        feature_signal(signal_feature, signal_matrix, *size, shape=shape, over_disc=over_disc)
        for shape in SHAPES
    ]
    step = np.asarray(signal_feature, dtype=np.float64) - np.asarray(signal_matrix, np.float64)
    pairs = _of_feature("pair_difference", *size, "half-sphere", over_disc=over_disc)
    sd: Floats = np.hypot(np.std(by_shape, axis=0), step * pairs / 2)
    return sd


def _of_feature(
    what: str,
    diameter_um: ArrayLike,
    range_um_feature: ArrayLike,
    range_um_matrix: ArrayLike,
    shape: str,
    *,
    over_disc: bool,
) -> Floats:
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
    values = simulated[what][:, :, SHAPES.index(shape), int(over_disc)]
    found = on_grid(values, axes, at) * np.minimum(size / smallest, 1.0)
    return np.where(known, found, np.nan)


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
