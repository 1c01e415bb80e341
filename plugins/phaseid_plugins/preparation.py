"""What preparation leaves on any sample."""

from __future__ import annotations

from collections.abc import Sequence

from phaseid.hooks import hookimpl
from phaseid.phases.contexts import Context

CONTEXTS = (Context("preparation", "Preparation", "Mounting, polishing and coating materials."),)


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS
