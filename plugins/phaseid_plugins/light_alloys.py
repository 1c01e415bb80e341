"""Aluminium, magnesium, titanium and zirconium alloys."""

from __future__ import annotations

from collections.abc import Sequence

from phaseid.hooks import hookimpl
from phaseid.phases.contexts import Coexistence, Context

CONTEXTS = (
    Context("aluminium-alloy", "Aluminium alloy", "Aluminium matrix with intermetallics."),
    Context(
        "aluminium-alloy/cast",
        "Cast aluminium alloy",
        "Silicon eutectic with iron, copper and magnesium phases.",
    ),
    Context(
        "aluminium-alloy/1xxx",
        "1xxx aluminium",
        "Nearly pure aluminium with iron and silicon phases.",
    ),
    Context(
        "aluminium-alloy/2xxx", "2xxx aluminium", "Aluminium-copper: theta, S phase, Al7Cu2Fe."
    ),
    Context(
        "aluminium-alloy/3xxx",
        "3xxx aluminium",
        "Aluminium-manganese alloys with Al6(Mn,Fe) and alpha-Al(Mn,Fe)Si.",
    ),
    Context(
        "aluminium-alloy/5xxx",
        "5xxx aluminium",
        "Aluminium-magnesium: beta phase, Mg2Si, Al6(Mn,Fe).",
    ),
    Context(
        "aluminium-alloy/6xxx",
        "6xxx aluminium",
        "Aluminium-magnesium-silicon alloys with Mg2Si and beta-AlFeSi.",
    ),
    Context(
        "aluminium-alloy/7xxx",
        "7xxx aluminium",
        "Aluminium-zinc-magnesium: eta phase, Al7Cu2Fe, S phase.",
    ),
    Context(
        "aluminium-alloy/8xxx", "8xxx aluminium", "Aluminium-iron and aluminium-lithium alloys."
    ),
    Context(
        "magnesium-alloy", "Magnesium alloy", "Magnesium matrix with Mg17Al12 and manganese phases."
    ),
    Context(
        "magnesium-alloy/rare-earth",
        "Magnesium rare-earth alloy",
        "Magnesium matrix with bright rare-earth intermetallics.",
    ),
    Context(
        "titanium-alloy",
        "Titanium alloy",
        "Alpha and beta titanium, borides, silicides, hard alpha.",
    ),
    Context(
        "titanium-alloy/aluminide", "Titanium aluminide", "Gamma and alpha-2 with beta and borides."
    ),
    Context(
        "zirconium-alloy", "Zirconium alloy", "Zirconium with hydrides and second-phase particles."
    ),
)

COEXISTENCE = (
    Coexistence(
        ("Eutectic silicon",),
        ("beta-Aluminium magnesium",),
        0.1,
        "Magnesium and silicon combine to Mg2Si, which leaves only one of them in excess (phase diagram "
        "Al-Mg-Si; Mondolfo 1976, Aluminum Alloys).",
        ("aluminium-alloy",),
    ),
    Coexistence(
        ("theta-Aluminium copper",),
        ("beta-Aluminium magnesium",),
        0.1,
        "S and T phases lie between them (phase diagram Al-Cu-Mg; Mondolfo 1976, Aluminum Alloys).",
        ("aluminium-alloy",),
    ),
    Coexistence(
        ("Aluminium iron (silicon) Al13Fe4 particle",),
        ("Eutectic silicon",),
        0.3,
        "Silicon turns Al13Fe4 into alpha- and beta-AlFeSi; it survives only where cooling was fast (phase "
        "diagram Al-Fe-Si; Mondolfo 1976, Aluminum Alloys).",
        ("aluminium-alloy",),
    ),
    Coexistence(
        ("Zirconium core (magnesium)",),
        ("beta-Magnesium aluminium", "Aluminium manganese Al8Mn5"),
        0.1,
        "Zirconium refines only magnesium free of aluminium and manganese, with which it settles out "
        "(common practice).",
        ("magnesium-alloy",),
    ),
)


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS


@hookimpl
def register_coexistence() -> Sequence[Coexistence]:
    return COEXISTENCE
