"""Evenly spread points and the normal distribution."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


def lattice(count: int, dimensions: int, generator: np.random.Generator) -> Floats:
    """Evenly spread points in the unit cube: an additive recurrence, shifted at random.

    The irrational steps are powers of the generalised golden ratio (Roberts 2018, common practice in
    quasi-Monte Carlo); they cover the cube far more evenly than independent draws.
    """
    ratio = 1.5
    for _ in range(40):
        ratio = (1.0 + ratio) ** (1.0 / (dimensions + 1))
    steps = ratio ** -np.arange(1, dimensions + 1)
    shift = generator.random(dimensions)
    points = np.mod(shift + np.outer(np.arange(1, count + 1), steps), 1.0)
    inner: Floats = np.clip(points, 1e-9, 1 - 1e-9)
    return inner


def normal_quantile(uniform: Floats) -> Floats:
    """Standard normal quantiles."""
    from scipy.special import ndtri

    quantile: Floats = ndtri(uniform)
    return quantile


def normal_cdf(value: Floats) -> Floats:
    """Standard normal distribution function."""
    from scipy.special import ndtr

    probability: Floats = ndtr(value)
    return probability
