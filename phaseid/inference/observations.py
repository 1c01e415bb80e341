"""What was seen: clusters of grey, and pieces of evidence about the grey scale."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True)
class Blend:
    """A cluster whose features are too small to be judged alone.

    Attributes
    ----------
    matrix : int
        Index of the observation that surrounds it.
    fraction : float
        Share of the signal that comes from the feature itself, 0 to 1.
    fraction_sd : float
        Its standard deviation.
    """

    matrix: int
    fraction: float
    fraction_sd: float = 0.05


@dataclass(frozen=True)
class Observation:
    """One cluster of grey.

    Attributes
    ----------
    grey_mean : float
        Mean grey of the cluster's interior; the bound where `clipped` is set.
    grey_se : float
        Standard error of that mean.
    clipped : {None, "low", "high"}
        The end of the grey range at which the true grey is lost.
    blend : Blend or None
        Set for features smaller than the signal volume.
    image : int
        Index of the image in a series; images of a series share one grey scale up to drift.
    """

    grey_mean: float
    grey_se: float
    clipped: Literal["low", "high"] | None = None
    blend: Blend | None = None
    image: int = 0


@dataclass(frozen=True)
class Anchor:
    """A grey whose signal is known: a known phase, a standard or the dark level.

    Attributes
    ----------
    grey, grey_se : float
        Measured grey and its standard error.
    signal, own_sd, share : ndarray of shape (rows,)
        Predicted signals of what it is, their own errors, and the weights of the composition variants.
    label : str
        What the user called it.
    observation : int or None
        Index of the cluster it was measured on, where it is one.
    clipped : {None, "low", "high"}
        A known phase whose grey is lost at an end of the range tells only a bound.
    image : int
        Index of the image in a series.
    """

    grey: float
    grey_se: float
    signal: NDArray[np.float64]
    own_sd: NDArray[np.float64]
    share: NDArray[np.float64]
    label: str
    observation: int | None = None
    clipped: Literal["low", "high"] | None = None
    image: int = 0

    @property
    def mean_signal(self) -> float:
        """Mean predicted signal."""
        return float(self.share @ self.signal)


def dark_level(grey: float, grey_se: float = 0.5, image: int = 0) -> Anchor:
    """Describe the grey of no signal at all (beam blanked, or a Faraday cup), by definition zero signal."""
    zero, one = np.zeros(1), np.ones(1)
    return Anchor(grey, grey_se, zero, zero, one, "dark level", image=image)
