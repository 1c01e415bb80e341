"""Cement, slag, ash and glass."""

from __future__ import annotations

from collections.abc import Sequence

from phaseid.hooks import hookimpl
from phaseid.phases.contexts import Coexistence, Context

CONTEXTS = (
    Context("cement", "Cement and concrete", "Clinker, hydrates, additions, aggregate."),
    Context(
        "cement/clinker", "Portland clinker", "Alite, belite, aluminate, ferrite, lime, periclase."
    ),
    Context(
        "cement/hydrated",
        "Hydrated cement",
        "C-S-H, portlandite, ettringite, AFm, residual clinker.",
    ),
    Context(
        "cement/calcium-aluminate", "Calcium aluminate cement", "CA, CA2, C12A7 and their hydrates."
    ),
    Context(
        "cement/degraded",
        "Degraded concrete",
        "Carbonation, sulphate attack, alkali-silica reaction, chloride.",
    ),
    Context("slag", "Slag", "Slags of metal making, cooled to glass and crystals."),
    Context(
        "slag/blast-furnace",
        "Blast-furnace slag",
        "Calcium aluminosilicate glass with melilite and merwinite.",
    ),
    Context(
        "slag/steelmaking", "Steelmaking slag", "Dicalcium silicate and ferrite, RO phase, lime."
    ),
    Context("slag/non-ferrous", "Non-ferrous slag", "Fayalite, magnetite, matte, speiss."),
    Context("ash", "Ash", "What is left of fuel or waste when it burns."),
    Context("ash/coal", "Coal fly ash", "Aluminosilicate glass, mullite, quartz, magnetite."),
    Context("ash/waste", "Waste-incineration ash", "Salts, melilite, metals, glass."),
    Context("glass", "Glass", "Container, flat, technical and ancient glasses."),
    Context("glass/defect", "Glass defect", "Stones, cords, unmelted batch, refractory."),
)

COEXISTENCE = (
    Coexistence(
        ("Quartz", "Cristobalite"),
        ("Lime",),
        0.2,
        "Silica and lime react to calcium silicates in the kiln; both left over mean a badly mixed or "
        "under-burnt clinker (Taylor 1997, Cement Chemistry).",
        ("cement/clinker",),
    ),
    Coexistence(
        ("Mayenite", "Krotite", "Grossite"),
        ("Alite", "Hatrurite"),
        0.2,
        "Calcium aluminate cements hold no alite, and Portland clinker no aluminate poorer in lime than "
        "C3A (phase diagram CaO-Al2O3-SiO2; Taylor 1997, Cement Chemistry).",
        ("cement/clinker", "cement/calcium-aluminate"),
    ),
    Coexistence(
        ("Gypsum", "Bassanite", "Anhydrite"),
        ("Monosulphate",),
        0.2,
        "Monosulphate and calcium sulphate react to ettringite (Taylor 1997, Cement Chemistry).",
        ("cement",),
    ),
    Coexistence(
        ("Portlandite",),
        ("Aluminium hydroxide gel", "Gibbsite", "CAH10", "C2AH8"),
        0.1,
        "Portlandite and aluminium hydroxide react to hydrogarnet and AFm phases (Taylor 1997, Cement "
        "Chemistry).",
        ("cement",),
    ),
    Coexistence(
        ("Portlandite",),
        ("Strätlingite",),
        0.1,
        "They react to hydrogarnet and C-S-H (Matschei, Lothenbach & Glasser 2007).",
        ("cement",),
    ),
    Coexistence(
        ("Portlandite",),
        ("M-S-H",),
        0.1,
        "Magnesium silicate hydrate forms only after portlandite is used up; with it brucite and C-S-H "
        "form (common practice).",
        ("cement",),
    ),
    Coexistence(
        ("Quartz", "Cristobalite", "Tridymite"),
        ("Lime", "Periclase", "Larnite", "Merwinite", "Gehlenite"),
        0.1,
        "Silica dissolves in or reacts with slags this basic; quartz here is a contaminant (Osborn & "
        "Muan 1960, phase diagram CaO-MgO-Al2O3-SiO2).",
        ("slag/blast-furnace", "slag/steelmaking"),
    ),
    Coexistence(
        ("Lime",),
        ("Wollastonite", "Rankinite", "Anorthite", "Gehlenite", "Fayalite"),
        0.05,
        "Lime reacts with silicates poorer in lime than dicalcium silicate (phase diagram "
        "CaO-Al2O3-SiO2).",
        ("slag",),
    ),
)


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS


@hookimpl
def register_coexistence() -> Sequence[Coexistence]:
    return COEXISTENCE
