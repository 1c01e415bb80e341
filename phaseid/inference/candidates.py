"""The candidates as arrays: one row per composition variant of each phase."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from phaseid.inference.axis import SignalAxis

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class CandidateSet:
    """All phases a cluster can be, with their predicted signals at the image's conditions.

    Parameters
    ----------
    names : sequence of str
        Name of each of the P phases.
    phase : ndarray of shape (R,)
        Phase index of each row; rows are the composition variants of all phases.
    signal : ndarray of shape (R,)
        Predicted detector signal of each row.
    own_sd : ndarray of shape (R,)
        Standard deviation of the row's own prediction error (mixing rule, density of defects).
    share : ndarray of shape (R,)
        Weight of each row within its phase; sums to one over each phase.
    mass_fractions : ndarray of shape (R, 103)
        Composition of each row, index Z - 1.
    upper : float or None
        End of the signal axis; None takes room above the largest signal.
    """

    names: Sequence[str]
    phase: NDArray[np.intp]
    signal: Floats
    own_sd: Floats
    share: Floats
    mass_fractions: NDArray[np.float32]
    upper: float | None = None
    axis: SignalAxis = field(init=False, repr=False)

    def __post_init__(self) -> None:
        upper = self.upper or max(0.5, 1.2 * float(self.signal.max(initial=0.0)))
        object.__setattr__(self, "axis", SignalAxis(upper))

    @property
    def size(self) -> int:
        """Number of phases."""
        return len(self.names)

    @cached_property
    def kernels(self) -> NDArray[np.float32]:
        """Density of each row's true signal on the axis, shape (R, n)."""
        return self.axis.kernels(self.signal, self.own_sd)

    @cached_property
    def cumulative(self) -> NDArray[np.float32]:
        """Probability that each row's true signal lies below each node, shape (R, n)."""
        step = np.diff(self.axis.nodes).astype(np.float32)
        halves = self.kernels[:, 1:] + self.kernels[:, :-1]
        table = np.zeros_like(self.kernels)
        np.cumsum(halves * (step / 2), axis=1, out=table[:, 1:])
        return np.minimum(table, 1.0)

    @cached_property
    def mean_signal(self) -> Floats:
        """Mean predicted signal of each phase over its composition range, shape (P,)."""
        return self.by_phase(self.share * self.signal)

    @cached_property
    def range_sd(self) -> Floats:
        """Standard deviation of each phase's signal over its range and own error, shape (P,)."""
        second = self.by_phase(self.share * (self.signal**2 + self.own_sd**2))
        return np.sqrt(np.maximum(second - self.mean_signal**2, 0.0))

    def seen_as(self, signal: Floats, own_sd: Floats) -> CandidateSet:
        """The same candidates with other signals on the same axis, as features of one size show them."""
        return replace(self, signal=signal, own_sd=own_sd, upper=self.axis.upper)

    def by_phase(self, values: NDArray[np.floating]) -> Floats:
        """Sum row values over the rows of each phase; shape (..., R) to (..., P)."""
        values = np.asarray(values, dtype=float)
        if values.ndim == 1:
            return np.bincount(self.phase, values, self.size).astype(float)
        flat = values.reshape(-1, values.shape[-1])
        summed = np.stack([np.bincount(self.phase, row, self.size) for row in flat])
        return summed.astype(float).reshape(*values.shape[:-1], self.size)
