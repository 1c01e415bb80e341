"""Solders, brazes, electronics."""

from __future__ import annotations

from collections.abc import Sequence

from phaseid.hooks import hookimpl
from phaseid.phases.contexts import Context

CONTEXTS = (
    Context("joint", "Joint", "Soldered, brazed or diffusion-bonded joints."),
    Context("joint/solder", "Solder joint", "Solder with intermetallics at the pads."),
    Context(
        "joint/solder/lead-free",
        "Lead-free solder joint",
        "Tin-silver-copper and tin-bismuth solders.",
    ),
    Context("joint/braze", "Brazed joint", "Silver, copper, nickel and aluminium brazes."),
    Context("electronics", "Electronics", "Packages, boards, dies and what joins them."),
    Context(
        "electronics/metallisation",
        "Metallisation",
        "Copper, nickel, gold, aluminium and barrier layers.",
    ),
    Context("electronics/semiconductor", "Semiconductor", "Silicon and compound semiconductors."),
)


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS
