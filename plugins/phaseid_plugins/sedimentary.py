"""Sedimentary rocks and soils."""

from __future__ import annotations

from collections.abc import Sequence

from phaseid.hooks import hookimpl
from phaseid.phases.contexts import Context

CONTEXTS = (
    Context("rock/sedimentary", "Sedimentary rock", "Clastic, chemical and biogenic sediments."),
    Context(
        "rock/sedimentary/sandstone",
        "Sandstone",
        "Quartz, feldspar, clay, carbonate cement, heavy minerals.",
    ),
    Context("rock/sedimentary/shale", "Shale", "Clays, quartz, pyrite, organic matter."),
    Context("rock/sedimentary/limestone", "Limestone", "Calcite, dolomite, clay, pyrite."),
    Context(
        "rock/sedimentary/dolostone", "Dolostone", "Dolomite with calcite, anhydrite and quartz."
    ),
    Context(
        "rock/sedimentary/evaporite",
        "Evaporite",
        "Gypsum, anhydrite, halite, potash salts, borates.",
    ),
    Context(
        "rock/sedimentary/phosphorite", "Phosphorite", "Carbonate fluorapatite, quartz, carbonates."
    ),
    Context("rock/sedimentary/coal", "Coal", "Macerals, clay, pyrite, siderite."),
    Context(
        "rock/sedimentary/bauxite", "Bauxite", "Gibbsite, boehmite, goethite, kaolinite, anatase."
    ),
    Context(
        "rock/sedimentary/heavy-mineral-sand",
        "Heavy-mineral sand",
        "Ilmenite, rutile, zircon, monazite, garnet.",
    ),
    Context("rock/soil", "Soil", "Weathering products, clays, oxides, organic matter."),
)


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS
