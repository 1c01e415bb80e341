"""Corrosion products, scale, wear debris, dust."""

from __future__ import annotations

from collections.abc import Sequence

from phaseid.hooks import hookimpl
from phaseid.phases.contexts import Context

CONTEXTS = (
    Context("corrosion", "Corrosion product", "What a metal turns into in water, air or hot gas."),
    Context("corrosion/steel", "Rust", "Iron oxides, hydroxides, chlorides, carbonate."),
    Context(
        "corrosion/copper",
        "Copper corrosion",
        "Cuprite, tenorite, malachite, chlorides, sulphates, sulphides.",
    ),
    Context("corrosion/aluminium", "Aluminium corrosion", "Hydroxides and hydrated salts."),
    Context("corrosion/hot", "Hot corrosion", "Sulphates, vanadates, sulphides, chromia, spinels."),
    Context("scale", "Scale", "Deposits and oxide scales."),
    Context("scale/oxide", "Oxide scale", "Mill scale and high-temperature oxides."),
    Context(
        "scale/water", "Water scale", "Carbonates, sulphates and silicates from water and brine."
    ),
    Context("wear-debris", "Wear debris", "Particles from bearings, brakes, engines."),
    Context("dust", "Dust", "Airborne and settled particles."),
    Context("dust/industrial", "Industrial dust", "Welding fume, fly ash, grinding dust."),
    Context("dust/mineral", "Mineral dust", "Soil and quarry dust."),
    Context(
        "dust/fibre",
        "Fibres",
        "Mineral wool, ceramic fibre, asbestos; treat as hazardous until shown otherwise.",
    ),
)


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS
