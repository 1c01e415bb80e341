"""Greys on an axis where the noise is the same everywhere (Anscombe 1948)."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from phaseid.image.noise import NoiseLaw


@dataclass(frozen=True)
class NoiseAxis:
    """The axis on which a step of one is one standard deviation of the pixel noise.

    Attributes
    ----------
    noise : NoiseLaw
    unit : float
        Widens the step where structure finer than a few pixels adds to the noise.
    """

    noise: NoiseLaw
    unit: float = 1.0

    def forward(self, grey: Any) -> NDArray[np.float64]:
        """Position of greys on the axis."""
        g = np.asarray(grey, dtype=float)
        a, b = self.noise.pair
        lowest = self.noise.floor
        if b <= 0:
            return np.asarray(g / np.sqrt(max(a, lowest)) / self.unit)
        start = (lowest - a) / b  # below this grey the law is flat
        above = np.maximum(g, start)
        curve = 2.0 / b * (np.sqrt(a + b * above) - np.sqrt(lowest))
        return np.asarray((curve + np.minimum(g - start, 0.0) / np.sqrt(lowest)) / self.unit)

    def back(self, position: Any) -> NDArray[np.float64]:
        """Greys at positions on the axis."""
        t = np.asarray(position, dtype=float) * self.unit
        a, b = self.noise.pair
        lowest = self.noise.floor
        if b <= 0:
            return np.asarray(t * np.sqrt(max(a, lowest)))
        above = np.maximum(t, 0.0)
        curve = ((0.5 * b * above + np.sqrt(lowest)) ** 2 - a) / b
        return np.asarray(curve + np.minimum(t, 0.0) * np.sqrt(lowest))

    def table(self, dtype: np.dtype[Any]) -> NDArray[np.float32] | None:
        """Positions of all greys of an integer type; None for floats."""
        if dtype.kind != "u":
            return None
        return self.forward(np.arange(np.iinfo(dtype).max + 1)).astype(np.float32)
