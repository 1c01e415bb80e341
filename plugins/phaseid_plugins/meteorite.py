"""Meteorites."""

from __future__ import annotations

from collections.abc import Sequence

from phaseid.hooks import hookimpl
from phaseid.phases.contexts import Coexistence, Context

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

COEXISTENCE = (
    Coexistence(
        ("Oldhamite", "Niningerite"),
        ("Magnetite", "Fayalite"),
        0.05,
        "Sulphides of calcium and magnesium need conditions so reducing that no oxidised iron is left "
        "(Keil 1968, enstatite chondrites).",
        ("rock/meteorite",),
    ),
)


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS


@hookimpl
def register_coexistence() -> Sequence[Coexistence]:
    return COEXISTENCE
