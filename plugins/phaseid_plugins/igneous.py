"""Igneous rocks."""

from __future__ import annotations

from collections.abc import Sequence

from phaseid.hooks import hookimpl
from phaseid.phases.contexts import Coexistence, Context

CONTEXTS = (
    Context("rock", "Rock", "Rocks and soils."),
    Context("rock/igneous", "Igneous rock", "Rocks from a melt."),
    Context(
        "rock/igneous/granite",
        "Granite",
        "Quartz, alkali feldspar, plagioclase, mica, accessory zircon, apatite, monazite.",
    ),
    Context(
        "rock/igneous/granitic-pegmatite",
        "Granitic pegmatite",
        "Coarse quartz and feldspar with lithium, beryllium, niobium-tantalum and rare-earth minerals.",
    ),
    Context(
        "rock/igneous/rhyolite", "Rhyolite", "Glass or fine groundmass with quartz and sanidine."
    ),
    Context("rock/igneous/syenite", "Syenite", "Alkali feldspar with little or no quartz."),
    Context("rock/igneous/andesite", "Andesite", "Plagioclase, pyroxene, amphibole."),
    Context(
        "rock/igneous/basalt", "Basalt", "Plagioclase, augite, olivine, titanomagnetite, glass."
    ),
    Context("rock/igneous/gabbro", "Gabbro", "Plagioclase, pyroxenes, olivine, ilmenite."),
    Context("rock/igneous/ultramafic", "Ultramafic rock", "Olivine, pyroxenes, chromite."),
    Context(
        "rock/igneous/kimberlite",
        "Kimberlite and lamproite",
        "Olivine, phlogopite, perovskite, ilmenite, carbonates.",
    ),
    Context(
        "rock/igneous/carbonatite",
        "Carbonatite",
        "Calcite, dolomite, apatite, pyrochlore, rare-earth carbonates.",
    ),
    Context("rock/igneous/alkaline", "Alkaline rock", "Nepheline, aegirine, sodalite, eudialyte."),
)

COEXISTENCE = (
    Coexistence(
        ("Quartz", "Tridymite", "Cristobalite"),
        (
            "Forsterite",
            "Nepheline",
            "Leucite",
            "Sodalite",
            "Kalsilite",
            "Melilite",
            "Larnite",
            "Perovskite",
            "Corundum",
        ),
        0.05,
        "Silica reacts with undersaturated minerals at equilibrium (silica saturation; Shand 1927, Eruptive Rocks).",
    ),
    Coexistence(
        ("Nepheline",),
        ("Enstatite",),
        0.1,
        "Nepheline and orthopyroxene react to olivine and albite (silica saturation, CIPW norm).",
    ),
)


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS


@hookimpl
def register_coexistence() -> Sequence[Coexistence]:
    return COEXISTENCE
