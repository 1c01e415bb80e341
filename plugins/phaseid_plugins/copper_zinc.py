"""Copper and zinc alloys."""

from __future__ import annotations

from collections.abc import Sequence

from phaseid.hooks import hookimpl
from phaseid.phases.contexts import Context

CONTEXTS = (
    Context("copper-alloy", "Copper alloy", "Copper and its alloys."),
    Context(
        "copper-alloy/brass",
        "Brass",
        "Copper-zinc with lead particles, beta phase, iron or silicon phases.",
    ),
    Context(
        "copper-alloy/bronze",
        "Tin bronze",
        "Copper-tin with delta phase, lead, phosphide, sulphide.",
    ),
    Context(
        "copper-alloy/aluminium-bronze",
        "Aluminium bronze",
        "Copper-aluminium with kappa and gamma-2 phases.",
    ),
    Context("zinc-alloy", "Zinc alloy", "Zinc casting alloys and zinc layers."),
)


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS
