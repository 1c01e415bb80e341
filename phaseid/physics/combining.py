"""Putting the elements' values together into those of compounds, for many phases at once."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from phaseid.physics.elements import Floats, atomic_numbers
from phaseid.physics.mixing import CompoundRule

ByElement = Callable[[Floats], Floats]
"""A value by atomic number, whole or not."""


def combined(composition: Floats, rule: CompoundRule, energy_keV: float, of_z: ByElement) -> Floats:
    """Value of each composition by one rule, shape (...)."""
    values: Floats = all_combined(composition, (rule,), energy_keV, [of_z])[0, 0]
    return values


def all_combined(
    composition: Floats,
    rules: tuple[CompoundRule, ...],
    energy_keV: float,
    functions: list[ByElement],
) -> Floats:
    """Value of each composition by every function and rule, shape (functions, rules, ...)."""
    shape = composition.shape[:-1]
    composition = composition.reshape(-1, composition.shape[-1])
    values = np.zeros((len(functions), len(rules), len(composition)))
    by_element = np.stack([of_z(atomic_numbers()) for of_z in functions])
    for column, rule in enumerate(rules):
        if rule.weights is not None:
            weight = rule.weights(energy_keV)
            above = (composition @ (weight * by_element).T).T
            values[:, column] = ratio(above, composition @ weight)
        elif rule.mean is not None:
            filled = composition.sum(axis=-1) > 0
            mean = rule.mean(composition[filled])
            for row, of_z in enumerate(functions):
                values[row, column, filled] = of_z(mean)
    return values.reshape(len(functions), len(rules), *shape)


def ratio(above: Floats, below: Floats) -> Floats:
    """`above` over `below`, 0 where there is nothing below."""
    below = np.broadcast_to(below, above.shape)
    quotient: Floats = np.divide(above, below, out=np.zeros(above.shape), where=below > 0)
    return quotient
