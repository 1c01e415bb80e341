"""The arithmetic of a mixture of grouped, censored greys: masses and moments of Gaussians in bins."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import log_ndtr, ndtr

FloatArray = NDArray[np.float64]
LOG_ROOT_2PI = 0.9189385332046727


@dataclass(frozen=True)
class Grouped:
    """Values with weights, the width of their bins, and the ends at which they are cut off."""

    value: FloatArray
    weight: FloatArray
    width: float
    low: float | None
    high: float | None

    @property
    def mean(self) -> float:
        """Weighted mean."""
        return float(self.weight @ self.value / self.weight.sum())

    @property
    def variance(self) -> float:
        """Weighted variance."""
        return max(float(self.weight @ (self.value - self.mean) ** 2 / self.weight.sum()), 1e-12)

    @property
    def plain(self) -> bool:
        """Whether values are exact and nothing is cut off."""
        return self.width == 0 and self.low is None and self.high is None

    def bounds(self) -> tuple[FloatArray, FloatArray]:
        """Lower and upper end of the bin of each value; infinite where cut off."""
        lower = self.value - self.width / 2
        upper = self.value + self.width / 2
        if self.low is not None:
            lower = np.where(self.value <= self.low, -np.inf, lower)
        if self.high is not None:
            upper = np.where(self.value >= self.high, np.inf, upper)
        return lower, upper


def log_sum(parts: FloatArray) -> FloatArray:
    """Logarithm of the sum of exponentials over the last axis."""
    top = parts.max(axis=-1, keepdims=True)
    return np.asarray(top[..., 0] + np.log(np.exp(parts - top).sum(axis=-1)))


def component_log_mass(data: Grouped, means: FloatArray, variances: FloatArray) -> FloatArray:
    """Log-probability of each value's bin (log-density where exact) under each component.

    Returns
    -------
    ndarray of shape (values, components)
    """
    sd = np.sqrt(variances)
    if data.plain:
        z = (data.value[:, None] - means) / sd
        return np.asarray(-0.5 * z * z - np.log(sd) - LOG_ROOT_2PI)
    lower, upper = data.bounds()
    exact = lower == upper
    with np.errstate(invalid="ignore", divide="ignore"):
        a = (lower[:, None] - means) / sd
        b = (upper[:, None] - means) / sd
        # In the upper tail work with the mirror image, where differences keep their digits.
        flip = a > 0
        a, b = np.where(flip, -b, a), np.where(flip, -a, b)
        high, low = log_ndtr(b), log_ndtr(a)
        mass = high + np.log1p(-np.exp(np.minimum(low - high, -1e-300)))
    z = (data.value[:, None] - means) / sd
    density = -0.5 * z * z - np.log(sd) - LOG_ROOT_2PI
    mass = np.where(exact[:, None], density, mass)
    # A bin far out in the tail underflows; the density times the width is exact enough there.
    if data.width > 0:
        mass = np.where(np.isfinite(mass), mass, density + np.log(data.width))
    return np.asarray(mass)


def component_moments(
    data: Grouped, means: FloatArray, variances: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """First and second moment of the grey within each value's bin, given each component.

    Returns
    -------
    first, second : ndarray of shape (values, components)
    """
    value = data.value[:, None]
    if data.plain:
        ones = np.ones_like(means)
        return value * ones, value**2 * ones
    sd = np.sqrt(variances)
    lower, upper = data.bounds()
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        a = (lower[:, None] - means) / sd
        b = (upper[:, None] - means) / sd
        mass = ndtr(b) - ndtr(a)
        mirrored = ndtr(-a) - ndtr(-b)
        mass = np.where(a > 0, mirrored, mass)
        pa = np.exp(-0.5 * a * a - LOG_ROOT_2PI)
        pb = np.exp(-0.5 * b * b - LOG_ROOT_2PI)
        apa = np.where(np.isfinite(a), a * pa, 0.0)
        bpb = np.where(np.isfinite(b), b * pb, 0.0)
        shift = (pa - pb) / mass
        first = means + sd * shift
        second = means**2 + 2 * means * sd * shift + variances * (1 + (apa - bpb) / mass)
    # Where the mass vanishes the component explains nothing of the bin; its middle serves.
    poor = ~np.isfinite(first) | ~np.isfinite(second) | (mass < 1e-12)
    middle = np.clip(value, -1e300, 1e300) * np.ones_like(means)
    first = np.where(poor, middle, first)
    second = np.where(poor, middle**2, second)
    first = np.clip(first, lower[:, None], upper[:, None])
    return np.asarray(first), np.asarray(np.maximum(second, first**2))


def starting_means(data: Grouped, k: int, rng: np.random.Generator | None) -> FloatArray:
    """Start at quantiles, or, with a generator, at values drawn far from one another.

    The random start is the seeding of Arthur & Vassilvitskii (2007).
    """
    order = np.argsort(data.value, kind="stable")
    value, weight = data.value[order], data.weight[order]
    if rng is None:
        cumulative = (np.cumsum(weight) - weight / 2) / weight.sum()
        return np.interp((np.arange(k) + 0.5) / k, cumulative, value)
    means = [float(rng.choice(value, p=weight / weight.sum()))]
    while len(means) < k:
        nearest = np.min((value[:, None] - np.array(means)) ** 2, axis=1) * weight
        if nearest.sum() <= 0:
            means.append(means[-1] + 1e-6)
            continue
        means.append(float(rng.choice(value, p=nearest / nearest.sum())))
    return np.sort(np.array(means))
