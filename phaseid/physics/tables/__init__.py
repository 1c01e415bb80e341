"""Simulated tables: what the trajectories say, kept so that nobody has to wait for it.

``python -m phaseid.physics.tables.make NAME`` makes them anew.
"""

from __future__ import annotations

import json
from functools import cache
from importlib import resources

import numpy as np

from phaseid.physics.elements import Floats

NAMES = ("coats", "tilts", "depths", "features")


@cache
def table(name: str) -> dict[str, Floats]:
    """Arrays of one of `NAMES`, read-only; what each holds is said where it is made."""
    text = resources.files(__package__).joinpath(f"{name}.json").read_text(encoding="utf-8")
    arrays = {key: np.array(values) for key, values in json.loads(text)["arrays"].items()}
    for values in arrays.values():
        values.flags.writeable = False
    return arrays


def on_grid(values: Floats, axes: list[Floats], at: list[Floats]) -> Floats:
    """Interpolate linearly on a rectangular grid, constant outside.

    Parameters
    ----------
    values : ndarray
        Its first ``len(axes)`` axes are those of the grid.
    axes : list of ndarray
        Ascending positions along each axis.
    at : list of ndarray
        One array of coordinates for each axis, all of one shape (...).

    Returns
    -------
    ndarray of shape (..., rest of the axes of `values`)
    """
    lower, share = [], []
    for axis, position in zip(axes, at, strict=True):
        inside = np.clip(position, axis[0], axis[-1])
        cell = np.clip(np.searchsorted(axis, inside, side="right") - 1, 0, len(axis) - 2)
        lower.append(cell)
        share.append((inside - axis[cell]) / (axis[cell + 1] - axis[cell]))
    rest = (1,) * (values.ndim - len(axes))
    total: Floats = np.zeros(())
    for corner in range(2 ** len(axes)):
        steps = [corner >> bit & 1 for bit in range(len(axes))]
        weight = np.ones(np.shape(at[0]))
        for step, part in zip(steps, share, strict=True):
            weight = weight * (part if step else 1.0 - part)
        index = tuple(cell + step for cell, step in zip(lower, steps, strict=True))
        total = total + values[index] * weight.reshape(weight.shape + rest)
    return total
