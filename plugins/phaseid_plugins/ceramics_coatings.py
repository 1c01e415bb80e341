"""Ceramics, refractories, coatings, pigments, abrasives."""

from __future__ import annotations

from collections.abc import Sequence

from phaseid.hooks import hookimpl
from phaseid.phases.contexts import Context

CONTEXTS = (
    Context("ceramic", "Ceramic", "Technical ceramics."),
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
    Context("ceramic/whiteware", "Whiteware", "Porcelain, stoneware, glazes."),
    Context(
        "ceramic/electronic", "Electronic ceramic", "Titanates, niobates, varistors, electrodes."
    ),
    Context("ceramic/bio", "Bioceramic", "Calcium phosphates, bioglasses, zirconia, alumina."),
    Context("ceramic/nuclear", "Nuclear ceramic", "Oxide fuels and waste forms; radioactive."),
    Context("refractory", "Refractory", "Bricks, castables, crucibles."),
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


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS
