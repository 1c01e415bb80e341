"""What limits the prediction for one phase; what limits it for all is `Conditions.flags`."""

from __future__ import annotations

from numpy.typing import ArrayLike

from phaseid.physics.conditions import Conditions, Flag
from phaseid.physics.elements import SYMBOLS, as_compositions
from phaseid.physics.model_error import model_error
from phaseid.physics.signals import signal_under

_LIGHT_SHARE, _HYDROGEN_SHARE, _RULE_SPREAD = 0.10, 0.03, 0.05


def phase_flags(
    mass_fractions: ArrayLike, conditions: Conditions | None = None
) -> tuple[Flag, ...]:
    """Say what makes the prediction for a composition less certain than usual.

    Parameters
    ----------
    mass_fractions : array_like of shape (103,)
    conditions : Conditions or None
        None is ``Conditions()``.

    Returns
    -------
    tuple of Flag
        ``hydrogen``, ``light-elements``, ``beyond-uranium`` or ``light-with-heavy``; empty for
        most phases.
    """
    under = conditions or Conditions()
    composition = as_compositions(mass_fractions)
    found: list[Flag] = []
    if composition[0] > _HYDROGEN_SHARE:
        found.append(
            Flag(
                "hydrogen",
                f"Hydrogen ({composition[0]:.1%} by mass) is taken to send nothing back; no value "
                "is published for it.",
            )
        )
    light = composition[1:5].sum()
    if light > _LIGHT_SHARE:
        found.append(
            Flag(
                "light-elements",
                f"{light:.0%} by mass is lighter than carbon, where the formulas are extrapolated.",
            )
        )
    if composition[92:].sum() > 0:
        heaviest = SYMBOLS[int(composition.nonzero()[0][-1])]
        found.append(
            Flag("beyond-uranium", f"{heaviest} is beyond uranium, where nothing was measured.")
        )
    predicted = float(signal_under(composition, under))
    spread = float(model_error(composition, under).own_sd)
    if spread > _RULE_SPREAD * predicted > 0:
        found.append(
            Flag(
                "light-with-heavy",
                f"The compound rules differ by {spread / predicted:.0%} for this mixture of light "
                "and heavy elements.",
            )
        )
    return tuple(found)
