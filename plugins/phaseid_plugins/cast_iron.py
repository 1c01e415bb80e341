"""Cast irons."""

from __future__ import annotations

from collections.abc import Sequence

from phaseid.hooks import hookimpl
from phaseid.phases.contexts import Coexistence, Context

CONTEXTS = (
    Context("cast-iron", "Cast iron", "Iron with more carbon than austenite can hold."),
    Context(
        "cast-iron/grey",
        "Grey cast iron",
        "Flake graphite in pearlite or ferrite, steadite, manganese sulphide.",
    ),
    Context(
        "cast-iron/ductile",
        "Ductile cast iron",
        "Spheroidal graphite with magnesium and rare-earth nuclei.",
    ),
    Context("cast-iron/white", "White cast iron", "Ledeburite: cementite instead of graphite."),
    Context(
        "cast-iron/high-chromium",
        "High-chromium cast iron",
        "M7C3 carbides in martensite or austenite.",
    ),
)

COEXISTENCE = (
    Coexistence(
        ("Manganese sulphide inclusion",),
        ("Magnesium sulphide inclusion",),
        0.2,
        "Magnesium takes the sulphur from manganese; manganese sulphide is left only where the treatment "
        "failed (common practice).",
        ("cast-iron/ductile",),
    ),
)


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS


@hookimpl
def register_coexistence() -> Sequence[Coexistence]:
    return COEXISTENCE
