"""How much noise is left after each smoothing step, for white and for correlated noise."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from phaseid.image.filters import kernel_of

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class Response:
    """Standard deviations per unit of pixel noise, indexed by the number of smoothing steps.

    Attributes
    ----------
    level : ndarray
        Of the smoothed image.
    difference : ndarray
        Of a difference over ``2**step`` pixels of it, root mean square of both directions.
    area : ndarray
        Pixels that one independent value stands for.
    """

    level: FloatArray
    difference: FloatArray
    area: FloatArray


@lru_cache(maxsize=64)
def response(row: tuple[float, ...], column: tuple[float, ...], steps: int) -> Response:
    """Propagate the noise through the smoothing.

    Parameters
    ----------
    row, column : tuple of float
        Autocorrelation of the noise at lags 1, 2, ... along a row and down a column; taken as separable.
    steps : int

    Returns
    -------
    Response
    """
    level, difference, area = [], [], []
    for step in range(steps + 1):
        kernel = kernel_of(step)
        along, down = _power(kernel, kernel, row), _power(kernel, kernel, column)
        level.append(np.sqrt(along * down))
        area.append(1.0 / max(_power(kernel, kernel, ()) ** 2, 1e-300))
        apart = np.zeros(len(kernel) + 2**step)
        apart[2**step :] += kernel
        apart[: len(kernel)] -= kernel
        power = _power(apart, apart, row) * down + along * _power(apart, apart, column)
        difference.append(np.sqrt(0.5 * power))
    return Response(np.array(level), np.array(difference), np.array(area))


def _power(a: FloatArray, b: FloatArray, correlation: tuple[float, ...]) -> float:
    """Covariance of two weighted sums of noise of unit variance."""
    total = float(a @ b)
    for lag, value in enumerate(correlation, start=1):
        if lag < len(a):
            total += value * float(a[lag:] @ b[:-lag] + a[:-lag] @ b[lag:])
    return max(total, 1e-12)
