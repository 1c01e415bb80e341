"""The smooth part of the model's error: what neighbouring phases share.

A wrong eta formula, a bent detector response or a little gamma move all signals of one region of the
axis together. Grey against signal is then a straight line plus a smooth departure; the line is the
grey scale, the departure a Gaussian process (kriging with a linear trend).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

_KNOTS = 96


@dataclass(frozen=True)
class Departure:
    """A Gaussian process on the signal axis, as a few independent standard normal coefficients.

    Attributes
    ----------
    knots : ndarray of shape (k,)
        Signals at which the basis is tabulated, evenly spaced from 0.
    basis : ndarray of shape (terms, k)
        Signal shift per unit of each coefficient.
    """

    knots: Floats
    basis: Floats

    @property
    def terms(self) -> int:
        """Number of coefficients."""
        return len(self.basis)

    def curves(self, coefficients: Floats) -> Floats:
        """Tabulate the departure of each particle.

        Parameters
        ----------
        coefficients : ndarray of shape (particles, terms)

        Returns
        -------
        ndarray of shape (particles, k)
        """
        return coefficients @ self.basis

    def at(self, curves: Floats, signal: Floats) -> tuple[Floats, Floats]:
        """Departure and its slope for one signal per particle, by linear interpolation."""
        step = self.knots[1]
        position = np.clip(signal / step, 0, len(self.knots) - 1.001)
        below = position.astype(np.intp)
        rows = np.arange(len(curves))
        left, right = curves[rows, below], curves[rows, below + 1]
        return left + (position - below) * (right - left), (right - left) / step

    def undo(self, curves: Floats, true_signal: Floats) -> Floats:
        """Solve ``u + departure(u) = true_signal`` for the apparent signal u."""
        apparent = true_signal.copy()
        # Newton's method; a steep departure is not followed all the way, or it could turn back.
        for _ in range(5):
            shift, slope = self.at(curves, apparent)
            apparent = apparent - (apparent + shift - true_signal) / np.maximum(1.0 + slope, 0.4)
        return apparent


def smooth_departure(
    upper: float, sd: Callable[[Floats], Floats], length: float, explained: float = 0.998
) -> Departure:
    """Reduce a Gaussian process on [0, upper] to its leading terms.

    Parameters
    ----------
    upper : float
        End of the signal axis.
    sd : callable
        Standard deviation of the departure at given signals, in signal units; zero at zero signal,
        because no electrons give no signal under every model.
    length : float
        Correlation length in log(signal + 0.02): models differ by their curvature in Z, and Z runs
        with the logarithm of the signal.
    explained : float
        Share of the variance the kept terms carry.

    Returns
    -------
    Departure

    Notes
    -----
    Squared-exponential correlation, as in kriging (Cressie 1993, Statistics for Spatial Data).
    """
    knots = np.linspace(0.0, upper, _KNOTS)
    position = np.log(knots + 0.02)
    correlation = np.exp(-0.5 * ((position[:, None] - position[None, :]) / length) ** 2)
    spread = sd(knots)
    covariance = spread[:, None] * correlation * spread[None, :]
    values, vectors = np.linalg.eigh(covariance)
    order = np.argsort(values)[::-1]
    values, vectors = np.maximum(values[order], 0.0), vectors[:, order]
    total = values.sum()
    if total == 0.0:
        return Departure(knots, np.zeros((1, _KNOTS)))
    kept = int(np.searchsorted(np.cumsum(values) / total, explained)) + 1
    basis = (vectors[:, :kept] * np.sqrt(values[:kept])).T
    return Departure(knots, np.ascontiguousarray(basis))
