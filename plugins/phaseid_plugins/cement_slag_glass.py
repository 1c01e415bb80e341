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
    Context("slag", "Slag", "Metallurgical slags."),
    Context("slag/blast-furnace", "Blast-furnace slag", "Glass, melilite, merwinite."),
    Context(
        "slag/steelmaking", "Steelmaking slag", "Dicalcium silicate and ferrite, RO phase, lime."
    ),
    Context("slag/non-ferrous", "Non-ferrous slag", "Fayalite, magnetite, matte, speiss."),
    Context("ash", "Ash", "Combustion ashes."),
    Context("ash/coal", "Coal fly ash", "Aluminosilicate glass, mullite, quartz, magnetite."),
    Context("ash/waste", "Waste-incineration ash", "Salts, melilite, metals, glass."),
    Context("glass", "Glass", "Technical glasses."),
    Context("glass/defect", "Glass defect", "Stones, cords, unmelted batch, refractory."),
)

COEXISTENCE = (
    Coexistence(
        ("Quartz", "Cristobalite"),
        ("Free lime", "Lime"),
        0.1,
        "Silica and lime react to calcium silicates in the kiln; both left over mean a badly mixed or under-burnt clinker (Taylor 1997, Cement Chemistry).",
    ),
    Coexistence(
        ("Mayenite", "Krotite", "Grossite"),
        ("Alite",),
        0.2,
        "Calcium aluminate cements hold no alite (Taylor 1997, Cement Chemistry).",
    ),
)


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS


@hookimpl
def register_coexistence() -> Sequence[Coexistence]:
    return COEXISTENCE
