"""Where to look for the grey scale once a first look has been taken.

The first particles draw the identities of two clusters from everything they can be; most of those
lines fit nothing else. A histogram of the lines that did fit, over the two signals, is a far better
place to draw the next ones from. A share of the first kind stays in, so nothing is ever excluded
(defensive importance sampling, Hesterberg 1995).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from phaseid.inference.axis import SignalAxis

Floats = NDArray[np.float64]

_NODES_PER_CELL = 6
_ADAPTED = 0.7


@dataclass(frozen=True)
class PairProposal:
    """Piecewise-constant density over the true signals of two clusters, mixed with their own densities.

    Attributes
    ----------
    axis : SignalAxis
    own : tuple of ndarray
        The two clusters' normalised densities on the nodes.
    edges : ndarray of shape (c + 1,)
        Cell edges on the signal axis.
    table : ndarray of shape (c, c)
        Probability of each cell, summing to one.
    """

    axis: SignalAxis
    own: tuple[Floats, Floats]
    edges: Floats
    table: Floats

    def draw(
        self, uniforms: Floats, generator: np.random.Generator
    ) -> tuple[Floats, Floats, Floats]:
        """Draw pairs of signals.

        Parameters
        ----------
        uniforms : ndarray of shape (n, 2)
        generator : numpy.random.Generator

        Returns
        -------
        first, second : ndarray of shape (n,)
            True signals.
        log_ratio : ndarray of shape (n,)
            Log of the clusters' own density over the density drawn from.
        """
        count = len(uniforms)
        adapted = generator.random(count) < _ADAPTED
        flat = np.cumsum(self.table.ravel())
        cell = np.minimum(np.searchsorted(flat, generator.random(count) * flat[-1]), len(flat) - 1)
        drawn = []
        for side, index in enumerate(np.unravel_index(cell, self.table.shape)):
            width = self.edges[index + 1] - self.edges[index]
            inside = self.edges[index] + uniforms[:, side] * width
            drawn.append(
                np.where(adapted, inside, self.axis.draw(self.own[side], uniforms[:, side]))
            )
        first, second = drawn
        own = self._own(0, first) * self._own(1, second)
        mixed = (1 - _ADAPTED) * own + _ADAPTED * self._adapted(first, second)
        with np.errstate(divide="ignore"):
            return first, second, np.log(own) - np.log(mixed)

    def _own(self, side: int, signal: Floats) -> Floats:
        below, share, _ = self.axis.locate(signal)
        row = self.own[side]
        return np.asarray(row[below] + share * (row[below + 1] - row[below]))

    def _adapted(self, first: Floats, second: Floats) -> Floats:
        cells = [
            np.clip(np.searchsorted(self.edges, s, side="right") - 1, 0, len(self.table) - 1)
            for s in (first, second)
        ]
        widths = np.diff(self.edges)
        return np.asarray(self.table[cells[0], cells[1]] / (widths[cells[0]] * widths[cells[1]]))


def adapt(
    axis: SignalAxis, own: tuple[Floats, Floats], first: Floats, second: Floats, weight: Floats
) -> PairProposal:
    """Build a proposal from weighted pairs of signals.

    Parameters
    ----------
    axis : SignalAxis
    own : tuple of ndarray
        The two clusters' densities on the nodes, any scale.
    first, second, weight : ndarray of shape (n,)

    Returns
    -------
    PairProposal
    """
    cells = int(np.ceil((len(axis) - 1) / _NODES_PER_CELL))
    nodes = np.minimum(np.arange(cells + 1) * _NODES_PER_CELL, len(axis) - 1)
    edges = axis.nodes[nodes]
    table, _, _ = np.histogram2d(first, second, bins=[edges, edges], weights=weight)
    # Smoothed once, so that a cell the first look missed between two good ones is looked into.
    padded = np.pad(table, 1, mode="edge")
    smoothed = np.zeros_like(table)
    for i in (-1, 0, 1):
        for j in (-1, 0, 1):
            share = 1.0 if i == j == 0 else 0.25
            smoothed += share * padded[1 + i : 1 + i + cells, 1 + j : 1 + j + cells]
    normalised = tuple(density / (density @ axis.widths) for density in own)
    return PairProposal(axis, (normalised[0], normalised[1]), edges, smoothed / smoothed.sum())
