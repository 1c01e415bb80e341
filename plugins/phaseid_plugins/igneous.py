"""Igneous rocks."""

from __future__ import annotations

from collections.abc import Sequence

from phaseid.hooks import hookimpl
from phaseid.phases.contexts import Coexistence, Context

CONTEXTS = (
    Context("rock", "Rock", "Natural rocks, ores, soils and meteorites."),
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
    Context(
        "rock/igneous/andesite",
        "Andesite",
        "Plagioclase with pyroxene or amphibole and a glassy groundmass.",
    ),
    Context(
        "rock/igneous/basalt", "Basalt", "Plagioclase, augite, olivine, titanomagnetite, glass."
    ),
    Context("rock/igneous/gabbro", "Gabbro", "Plagioclase, pyroxenes, olivine, ilmenite."),
    Context(
        "rock/igneous/ultramafic",
        "Ultramafic rock",
        "Olivine and pyroxenes with chromite, often serpentinised.",
    ),
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

_SILICA = ("Quartz", "Tridymite", "Cristobalite")

COEXISTENCE = (
    Coexistence(
        _SILICA,
        (
            "Forsterite",
            "Nepheline",
            "Leucite",
            "Kalsilite",
            "Sodalite",
            "Nosean",
            "Haüyne",
            "Cancrinite",
            "Melilite",
            "Åkermanite",
            "Larnite",
            "Monticellite",
            "Perovskite",
        ),
        0.05,
        "Silica reacts with undersaturated minerals (silica saturation; Shand 1927, Eruptive Rocks); both "
        "together mean a foreign grain.",
        ("rock/igneous",),
    ),
    Coexistence(
        _SILICA,
        ("Corundum", "Spinel"),
        0.1,
        "Silica reacts with corundum to aluminium silicate and with magnesian spinel to cordierite (phase "
        "diagram MgO-Al2O3-SiO2).",
        ("rock/igneous", "rock/metamorphic"),
    ),
    Coexistence(
        _SILICA,
        ("Baddeleyite",),
        0.3,
        "Baddeleyite and silica react to zircon; in slowly cooled mafic rocks it may survive beside late "
        "quartz (Heaman & LeCheminant 1993).",
        ("rock/igneous",),
    ),
    Coexistence(
        ("Nepheline", "Kalsilite"),
        ("Enstatite",),
        0.1,
        "Nepheline and orthopyroxene react to olivine and albite (silica saturation; Yoder & Tilley 1962).",
        ("rock/igneous",),
    ),
    Coexistence(
        ("Melilite", "Åkermanite"),
        ("Albite", "Plagioclase"),
        0.15,
        "Melilite and sodic plagioclase react to nepheline and clinopyroxene (Schairer & Yoder 1964).",
        ("rock/igneous",),
    ),
)


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS


@hookimpl
def register_coexistence() -> Sequence[Coexistence]:
    return COEXISTENCE
