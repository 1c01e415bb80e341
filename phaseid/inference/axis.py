"""The signal axis: where every phase has a place and every sum over phases is a look-up."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

# Errors of the predicted signal are relative, so the nodes are evenly spaced in log(signal + SHIFT);
# the shift keeps the axis finite at the dark end, where pores and the dark level lie.
SHIFT = 0.02
STEP = 0.004


@dataclass(frozen=True)
class SignalAxis:
    """Nodes on the signal axis and the densities' linear interpolation between them.

    Parameters
    ----------
    upper : float
        Largest signal on the axis, in the units of `phaseid.physics.energy.signal`.

    Attributes
    ----------
    nodes : ndarray of shape (n,)
        Signals of the nodes, ascending from 0.
    widths : ndarray of shape (n,)
        Trapezoid weights: ``densities @ widths`` is the integral over the axis.
    """

    upper: float
    nodes: Floats = field(init=False, repr=False)
    widths: Floats = field(init=False, repr=False)

    def __post_init__(self) -> None:
        count = int(np.ceil(np.log((self.upper + SHIFT) / SHIFT) / STEP)) + 1
        nodes = SHIFT * np.exp(STEP * np.arange(count)) - SHIFT
        nodes[0] = 0.0
        widths = np.zeros(count)
        widths[1:] += np.diff(nodes) / 2
        widths[:-1] += np.diff(nodes) / 2
        object.__setattr__(self, "nodes", nodes)
        object.__setattr__(self, "widths", widths)

    def __len__(self) -> int:
        return len(self.nodes)

    def locate(self, signal: Floats) -> tuple[NDArray[np.intp], Floats, NDArray[np.bool_]]:
        """Find the node below each signal, the share of the way to the next, and who is off the axis."""
        inside = (signal >= 0) & (signal <= self.nodes[-1])
        position = np.log(np.clip(signal, 0, self.nodes[-1]) / SHIFT + 1) / STEP
        below = np.minimum(position.astype(np.intp), len(self.nodes) - 2)
        share = (signal - self.nodes[below]) / (self.nodes[below + 1] - self.nodes[below])
        return below, np.clip(share, 0, 1), inside

    def kernels(self, signal: Floats, sd: Floats) -> NDArray[np.float32]:
        """Density of each row's true signal on the nodes.

        Parameters
        ----------
        signal, sd : ndarray of shape (rows,)
            Predicted signal and the standard deviation of the phase's own error.

        Returns
        -------
        ndarray of shape (rows, n), float32
            Gaussian densities cut at zero signal, each integrating to one by `widths`.
        """
        # A kernel narrower than the node spacing would slip between the nodes.
        floor = 0.75 * STEP * (signal + SHIFT)
        scale = np.sqrt(0.5) / np.hypot(sd, floor)
        density = np.outer(scale, self.nodes).astype(np.float32)
        density -= (scale * signal).astype(np.float32)[:, None]
        np.square(density, out=density)
        np.negative(density, out=density)
        np.exp(density, out=density)
        density /= (density @ self.widths.astype(np.float32))[:, None]
        return density

    def draw(self, density: Floats, uniform: Floats) -> Floats:
        """Draw signals from an unnormalised, piecewise-linear `density` at the quantiles `uniform`."""
        step = np.diff(self.nodes)
        masses = np.concatenate([[0.0], np.cumsum(step * (density[1:] + density[:-1]) / 2)])
        target = uniform * masses[-1]
        cell = np.clip(np.searchsorted(masses, target, side="right") - 1, 0, len(step) - 1)
        left, right, width = density[cell], density[cell + 1], step[cell]
        mass = target - masses[cell]
        # Inverse of the quadratic cumulative inside a cell, in the form that is safe for flat cells.
        slope = (right - left) / width
        root = np.sqrt(np.maximum(left * left + 2 * slope * mass, 0.0))
        moved = 2 * mass / np.maximum(left + root, 1e-300)
        drawn: Floats = self.nodes[cell] + np.clip(moved, 0, width)
        return drawn
