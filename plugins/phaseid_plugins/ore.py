"""Ores."""

from __future__ import annotations

from collections.abc import Sequence

from phaseid.hooks import hookimpl
from phaseid.phases.contexts import Coexistence, Context

CONTEXTS = (
    Context("rock/ore", "Ore", "Rocks mined for metals."),
    Context(
        "rock/ore/porphyry",
        "Porphyry copper ore",
        "Chalcopyrite, bornite, pyrite, molybdenite in altered granite.",
    ),
    Context(
        "rock/ore/epithermal",
        "Epithermal ore",
        "Gold-silver tellurides, sulphosalts, pyrite, adularia, alunite.",
    ),
    Context(
        "rock/ore/orogenic-gold",
        "Orogenic gold ore",
        "Gold with arsenopyrite, pyrite, carbonates, quartz.",
    ),
    Context(
        "rock/ore/volcanogenic-massive-sulphide",
        "Volcanogenic massive sulphide",
        "Pyrite, sphalerite, chalcopyrite, galena, baryte.",
    ),
    Context(
        "rock/ore/sediment-hosted-lead-zinc",
        "Sediment-hosted lead-zinc ore",
        "Galena, sphalerite, pyrite, dolomite, baryte.",
    ),
    Context(
        "rock/ore/magmatic-sulphide",
        "Magmatic nickel-copper ore",
        "Pyrrhotite, pentlandite and chalcopyrite with magnetite.",
    ),
    Context(
        "rock/ore/platinum-group",
        "Platinum-group ore",
        "Platinum-group minerals with base-metal sulphides or chromite.",
    ),
    Context("rock/ore/chromitite", "Chromitite", "Chromite, olivine, serpentine, laurite."),
    Context(
        "rock/ore/iron-oxide-copper-gold",
        "Iron-oxide copper-gold ore",
        "Hematite, magnetite, chalcopyrite, bornite, uraninite.",
    ),
    Context(
        "rock/ore/sediment-hosted-copper",
        "Sediment-hosted copper ore",
        "Chalcocite, bornite, chalcopyrite, carrollite.",
    ),
    Context(
        "rock/ore/tin-tungsten",
        "Tin-tungsten ore",
        "Cassiterite, wolframite, scheelite, arsenopyrite.",
    ),
    Context("rock/ore/rare-earth", "Rare-earth ore", "Bastnaesite, monazite, xenotime, parisite."),
    Context("rock/ore/uranium", "Uranium ore", "Uraninite, coffinite, brannerite; radioactive."),
    Context("rock/ore/iron", "Iron ore", "Hematite, goethite, magnetite, quartz."),
    Context("rock/ore/manganese", "Manganese ore", "Manganese oxides, braunite and rhodochrosite."),
    Context("rock/ore/laterite", "Laterite", "Goethite, nickel silicates, asbolane, gibbsite."),
    Context(
        "rock/ore/supergene", "Supergene ore", "Secondary copper, lead, zinc and silver minerals."
    ),
    Context(
        "rock/ore/antimony-mercury",
        "Antimony-mercury ore",
        "Stibnite, cinnabar and realgar in quartz or carbonate.",
    ),
)

COEXISTENCE = (
    Coexistence(
        ("Pyrrhotite", "Pentlandite"),
        ("Hematite",),
        0.15,
        "Pyrrhotite and hematite are separated by pyrite with magnetite (sulphur and oxygen fugacity; "
        "Barton & Skinner 1979); both together mean weathering.",
        ("rock/ore",),
    ),
    Coexistence(
        ("Pyrrhotite",),
        ("Covellite", "Chalcocite", "Digenite"),
        0.2,
        "These copper sulphides need a sulphur fugacity or oxidation at which pyrrhotite turns to pyrite "
        "(Barton & Skinner 1979); both together mean supergene alteration.",
        ("rock/ore",),
    ),
    Coexistence(
        ("Troilite",),
        ("Pyrite", "Marcasite"),
        0.1,
        "Pyrrhotite lies between troilite and pyrite (phase diagram Fe-S; Craig & Scott 1974).",
        ("rock",),
    ),
    Coexistence(
        ("Löllingite",),
        ("Pyrite",),
        0.1,
        "They react to arsenopyrite and pyrrhotite (Kretschmar & Scott 1976).",
        ("rock/ore", "rock/metamorphic"),
    ),
)


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS


@hookimpl
def register_coexistence() -> Sequence[Coexistence]:
    return COEXISTENCE
