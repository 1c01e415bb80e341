"""Evidence that contradicts itself is named, not averaged."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from phaseid.errors import InputError
from phaseid.inference.departure import Departure
from phaseid.inference.observations import Anchor
from phaseid.inference.scale import ScaleProblem

# Standard deviations beyond which two pieces of evidence about the scale cannot both be right.
IMPOSSIBLE = 4.0
SUSPECT = 3.0


def refuse_reversed(anchors: Sequence[Anchor], departure: Departure) -> None:
    """Refuse known greys whose order is the reverse of their signals' order.

    Parameters
    ----------
    anchors : sequence of Anchor
    departure : Departure

    Raises
    ------
    InputError
        Naming the two pieces of evidence.
    """
    smooth = np.sqrt((departure.basis**2).sum(axis=0))
    exact = [a for a in anchors if a.clipped is None]
    for n, first in enumerate(exact):
        for second in exact[n + 1 :]:
            low, high = sorted((first, second), key=lambda a: a.mean_signal)
            apart = high.mean_signal - low.mean_signal
            error = np.hypot(_sd(low, departure, smooth), _sd(high, departure, smooth))
            noise = np.hypot(low.grey_se, high.grey_se)
            if apart > IMPOSSIBLE * error and low.grey - high.grey > IMPOSSIBLE * noise:
                raise InputError(
                    f"The evidence contradicts itself: {low.label} must be darker than {high.label}, "
                    f"but is given at grey {low.grey:.4g} and {high.label} at {high.grey:.4g}; "
                    "correct one of the two."
                )


def _sd(anchor: Anchor, departure: Departure, smooth: np.ndarray) -> float:
    spread = np.interp(anchor.mean_signal, departure.knots, smooth)
    second = anchor.share @ (anchor.signal**2 + anchor.own_sd**2)
    own = max(float(second) - anchor.mean_signal**2, 0.0)
    return float(np.sqrt(spread**2 + own))


def suspect_anchors(
    problem: ScaleProblem, anchors: Sequence[Anchor], seed: int = 0
) -> list[tuple[Anchor, float]]:
    """Find the anchors that the other anchors do not agree with.

    Parameters
    ----------
    problem : ScaleProblem
        Without observations; axis and departure are used.
    anchors : sequence of Anchor
        Three or more are needed for a verdict: two points always lie on a line.
    seed : int

    Returns
    -------
    list of (Anchor, float)
        Anchors more than `SUSPECT` standard deviations from what the others predict. First the one
        without which the others agree best: a wrong reference also makes right ones look wrong.
    """
    exact = [a for a in anchors if a.clipped is None]
    if len(exact) < 3:
        return []
    found = []
    for n, anchor in enumerate(exact):
        others = [a for m, a in enumerate(exact) if m != n]
        rest = ScaleProblem(
            problem.axis, problem.departure, (), np.zeros((0, len(problem.axis))), others
        )
        particles = rest.sample(seed, effective=500.0)
        true = np.full(len(particles.gain), anchor.mean_signal)
        grey = particles.offset + particles.gain * problem.departure.undo(particles.curves, true)
        mean, spread = particles.mean_sd(grey)
        gain = float(particles.weight @ particles.gain)
        own = _sd(anchor, problem.departure, np.zeros_like(problem.departure.knots))
        score = float(
            abs(anchor.grey - mean) / np.sqrt(spread**2 + (gain * own) ** 2 + anchor.grey_se**2)
        )
        if score > SUSPECT:
            found.append((particles.log_evidence, anchor, score))
    found.sort(key=lambda entry: -entry[0])
    return [(anchor, score) for _, anchor, score in found]
