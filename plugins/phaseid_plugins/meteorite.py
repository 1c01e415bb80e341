"""Meteorites."""

from __future__ import annotations

from collections.abc import Sequence

from phaseid.hooks import hookimpl
from phaseid.phases.contexts import Context

CONTEXTS = (
    Context("rock/meteorite", "Meteorite", "Meteorites of any class."),
    Context("rock/meteorite/chondrite", "Chondrite", "Olivine, pyroxene, metal, troilite, glass."),
    Context(
        "rock/meteorite/achondrite",
        "Achondrite",
        "Basaltic and ultramafic meteorites, lunar and martian rocks.",
    ),
    Context("rock/meteorite/iron", "Iron meteorite", "Kamacite, taenite, schreibersite, troilite."),
)


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS
