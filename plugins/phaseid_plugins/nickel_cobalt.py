"""Nickel and cobalt alloys."""

from __future__ import annotations

from collections.abc import Sequence

from phaseid.hooks import hookimpl
from phaseid.phases.contexts import Context

CONTEXTS = (
    Context("nickel-alloy", "Nickel alloy", "Alloys whose matrix is nickel."),
    Context(
        "nickel-alloy/superalloy",
        "Nickel superalloy",
        "Gamma with gamma-prime or gamma-double-prime, carbides, borides, topologically close-packed phases.",
    ),
    Context(
        "nickel-alloy/superalloy/cast",
        "Cast nickel superalloy",
        "Dendritic segregation, eutectic gamma-prime, Laves and MC carbides.",
    ),
    Context(
        "nickel-alloy/superalloy/wrought",
        "Wrought nickel superalloy",
        "Gamma with delta or eta phase, carbides and nitrides in bands.",
    ),
    Context(
        "nickel-alloy/solid-solution",
        "Solid-solution nickel alloy",
        "Nickel-copper, nickel-chromium and nickel-molybdenum alloys.",
    ),
    Context("cobalt-alloy", "Cobalt alloy", "Alloys whose matrix is cobalt."),
    Context(
        "cobalt-alloy/wear",
        "Wear-resistant cobalt alloy",
        "Cobalt matrix with chromium and tungsten carbides.",
    ),
)


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS
