"""Ceramics, refractories, coatings, pigments, abrasives."""

from __future__ import annotations

from collections.abc import Sequence

from phaseid.hooks import hookimpl
from phaseid.phases.contexts import Coexistence, Context

CONTEXTS = (
    Context("ceramic", "Ceramic", "Fired inorganic materials, from structural to electronic."),
    Context("ceramic/alumina", "Alumina ceramic", "Alumina with glass, spinel, mullite, zirconia."),
    Context("ceramic/zirconia", "Zirconia ceramic", "Stabilised zirconia, alumina inclusions."),
    Context(
        "ceramic/silicon-nitride",
        "Silicon nitride ceramic",
        "Beta Si3N4 or sialon with bright grain-boundary glass.",
    ),
    Context(
        "ceramic/silicon-carbide",
        "Silicon carbide ceramic",
        "SiC with carbon, silicon, boron carbide or oxide binder.",
    ),
    Context(
        "ceramic/whiteware",
        "Whiteware",
        "Porcelain and stoneware: quartz, mullite, glass, and the glaze.",
    ),
    Context(
        "ceramic/electronic", "Electronic ceramic", "Titanates, niobates, varistors, electrodes."
    ),
    Context("ceramic/bio", "Bioceramic", "Calcium phosphates, bioglasses, zirconia, alumina."),
    Context("ceramic/nuclear", "Nuclear ceramic", "Oxide fuels and waste forms; radioactive."),
    Context("refractory", "Refractory", "Bricks, castables and crucibles that bear heat and slag."),
    Context(
        "refractory/basic", "Basic refractory", "Magnesia, chrome, dolomite, spinel, forsterite."
    ),
    Context(
        "refractory/alumina-silica",
        "Alumina-silica refractory",
        "Fireclay, mullite, corundum, zirconia.",
    ),
    Context("coating", "Coating", "Layers on metals and ceramics."),
    Context(
        "coating/thermal-barrier",
        "Thermal-barrier coating",
        "Stabilised zirconia, bond coat, thermally grown oxide.",
    ),
    Context(
        "coating/environmental-barrier",
        "Environmental-barrier coating",
        "Rare-earth silicates on silicon and silicon carbide.",
    ),
    Context("coating/hard", "Hard coating", "Nitrides, carbides, diamond-like carbon."),
    Context("coating/galvanised", "Galvanised coating", "Zinc and zinc-iron phases."),
    Context("coating/thermal-spray", "Thermal-spray coating", "Splats, oxides, carbides in metal."),
    Context("pigment", "Pigment", "Paint layers, inks, art."),
    Context("abrasive", "Abrasive", "Grinding and blasting media."),
)

COEXISTENCE = (
    Coexistence(
        ("Periclase",),
        ("Corundum",),
        0.3,
        "Magnesia and alumina react to spinel when fired; both are left where grains are coarse (phase "
        "diagram MgO-Al2O3).",
        ("ceramic", "refractory"),
    ),
    Coexistence(
        ("Periclase",),
        ("Quartz", "Cristobalite", "Tridymite", "Mullite"),
        0.1,
        "Magnesia reacts with silica to forsterite and with mullite to spinel and forsterite (phase "
        "diagram MgO-Al2O3-SiO2).",
        ("ceramic", "refractory"),
    ),
    Coexistence(
        ("Lime",),
        ("Quartz", "Cristobalite", "Tridymite", "Mullite", "Corundum", "Zircon"),
        0.05,
        "Lime reacts with acid oxides when fired (phase diagram CaO-Al2O3-SiO2; common practice).",
        ("ceramic", "refractory"),
    ),
    Coexistence(
        ("Graphite",),
        ("Hematite", "Magnetite"),
        0.2,
        "Carbon reduces iron oxide at service temperature (Ellingham diagram).",
        ("refractory",),
    ),
    Coexistence(
        ("Silicon carbide", "beta-Silicon nitride"),
        ("Hematite", "Magnetite"),
        0.2,
        "Carbide and nitride reduce iron oxide when fired (Ellingham diagram).",
        ("ceramic", "refractory"),
    ),
)


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS


@hookimpl
def register_coexistence() -> Sequence[Coexistence]:
    return COEXISTENCE
