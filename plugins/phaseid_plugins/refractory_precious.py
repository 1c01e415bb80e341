"""Refractory and precious metals."""

from __future__ import annotations

from collections.abc import Sequence

from phaseid.hooks import hookimpl
from phaseid.phases.contexts import Context

CONTEXTS = (
    Context(
        "refractory-metal",
        "Refractory metal",
        "Tungsten, molybdenum, tantalum, niobium, rhenium and their alloys.",
    ),
    Context(
        "precious-metal", "Precious metal", "Gold, silver, platinum-group metals and their alloys."
    ),
)


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS
