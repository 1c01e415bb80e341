"""How wrong a predicted signal may be, split into what neighbours share and what each phase has alone.

The signal T that nature gives to a material of predicted signal S is modelled as

    T = gain (S + smooth(S) + own)

The gain is absorbed by the grey scale. *smooth* is the wrong formula for eta of the elements: one
curve for all phases, zero at zero signal. *own* is the wrong rule for compounds: independent from
phase to phase.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from math import erf, exp, pi, sqrt

import numpy as np
from numpy.typing import ArrayLike

from phaseid.physics.conditions import Conditions
from phaseid.physics.elemental import BackscatterModel, models
from phaseid.physics.elements import Floats
from phaseid.physics.signals import signal_ensemble, signal_of_atomic_number, signal_under

SIGNAL_SHIFT = 0.02
"""The correlation length is measured on the axis ``log(signal + SIGNAL_SHIFT)``."""


@dataclass(frozen=True)
class ModelError:
    """Sizes of the two parts of the model's error.

    Attributes
    ----------
    own_sd : ndarray of shape (...)
        Each phase's own standard deviation, in units of the signal: root mean square deviation of
        the defensible compound rules from the rule in use, at a fixed elemental model. Zero for a
        pure element.
    relative_sd : float
        Standard deviation of the smooth part over the signal.
    length : float
        Correlation length of the smooth part on the axis ``log(signal + SIGNAL_SHIFT)``, for the
        correlation ``exp(-d^2 / (2 length^2))``.
    """

    own_sd: Floats
    relative_sd: float
    length: float

    def smooth_sd(self, signal_value: ArrayLike) -> Floats:
        """Standard deviation of the smooth part, in units of the signal; 0 at 0."""
        smooth: Floats = self.relative_sd * np.abs(np.asarray(signal_value, dtype=np.float64))
        return smooth


def model_error(mass_fractions: ArrayLike, conditions: Conditions | None = None) -> ModelError:
    """Sizes of the model's error for given compositions.

    Parameters
    ----------
    mass_fractions : array_like of shape (..., 103)
    conditions : Conditions or None
        None is ``Conditions()``.

    Returns
    -------
    ModelError
    """
    under = conditions or Conditions()
    by_rule, _ = signal_ensemble(
        mass_fractions,
        under.energy_keV,
        under.tilt_deg,
        under.detector,
        under.coat,
        elemental=(under.model,),
    )
    in_use = signal_under(mass_fractions, under)
    own = np.sqrt(np.mean((by_rule - in_use) ** 2, axis=0))
    relative_sd, length = smooth_part(under)
    return ModelError(own, relative_sd, length)


@lru_cache(maxsize=64)
def smooth_part(conditions: Conditions) -> tuple[float, float]:
    """Relative size and correlation length of the smooth part under given conditions.

    Every confirmed elemental model is compared with the one in use from oxygen to lead, where nearly
    all phases lie (below carbon the formulas are extrapolations and part without bound). After
    the gain is taken out, a departure r(u) is left on the axis u = log(signal + shift). Its mean
    square and that of its slope, averaged over the models, are set equal to what a stationary
    Gaussian process of the same length of axis has after its mean is taken out::

        <r^2> = sd^2 (1 - c),   <r'^2> = sd^2 / length^2

    with c the mean correlation between two points of the axis. Taking the gain out of a smooth
    curve takes much of its size with it; without the factor 1 - c the sizes would be too small by
    nearly half.

    All confirmed models count alike, the rough ones (Archard) too: the laboratories' own values
    differ by as much (13 % at carbon to 3 % at gold), so leaving them out would claim more than
    is known.

    Returns
    -------
    relative_sd, length : float
    """
    z = np.linspace(5.0, 95.0, 721)
    in_use = signal_of_atomic_number(z, conditions, conditions.model)
    low, high = np.interp([8.0, 82.0], z, in_use)
    axis = np.linspace(np.log(low + SIGNAL_SHIFT), np.log(high + SIGNAL_SHIFT), 60)
    at = np.exp(axis) - SIGNAL_SHIFT
    squares, slopes = [], []
    for other in _others(conditions.model):
        theirs = signal_of_atomic_number(z, conditions, other)
        departure = np.log(np.interp(at, in_use, theirs) / at)
        departure -= departure.mean()
        squares.append(np.mean(departure**2))
        slopes.append(np.mean(np.gradient(departure, axis) ** 2))
    observed = float(np.mean(squares) / np.mean(slopes))
    span = float(axis[-1] - axis[0])
    length = _length_from(observed, span)
    left = 1.0 - _mean_correlation(span / length)
    return float(np.sqrt(np.mean(squares) / left)), length


def _others(model: str | BackscatterModel) -> list[BackscatterModel]:
    name = model if isinstance(model, str) else model.name
    return [other for other in models() if other.name != name]


def _length_from(ratio: float, span: float) -> float:
    """Solve ``length^2 (1 - mean correlation) = ratio`` by bisection."""
    # The left side levels off at span^2 / 12, which a straight line reaches: no longer than the axis.
    low, high = 1e-3 * span, span
    for _ in range(60):
        middle = 0.5 * (low + high)
        if middle**2 * (1.0 - _mean_correlation(span / middle)) < ratio:
            low = middle
        else:
            high = middle
    return 0.5 * (low + high)


def _mean_correlation(a: float) -> float:
    """Mean of ``exp(-d^2/2)`` between two points uniform on an interval of length `a`."""
    return sqrt(2 * pi) / a * erf(a / sqrt(2)) - 2 / a**2 * (1 - exp(-(a**2) / 2))
