"""Steels, by deoxidation practice, family and treatment."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from phaseid.hooks import hookimpl
from phaseid.hooks.specs import Situation
from phaseid.phases.contexts import Coexistence, Context

CONTEXTS = (
    Context("steel", "Steel", "Wrought and cast steel of any kind."),
    Context(
        "steel/aluminium-killed",
        "Aluminium-killed steel",
        "Deoxidised with aluminium: alumina, spinels and calcium aluminates, manganese sulphide.",
    ),
    Context(
        "steel/silicon-killed",
        "Silicon-killed steel",
        "Deoxidised with silicon and manganese: silicates such as rhodonite and spessartine, silica, sulphides.",
    ),
    Context(
        "steel/calcium-treated",
        "Calcium-treated steel",
        "Calcium turns alumina into liquid calcium aluminates and manganese sulphide into (Ca,Mn)S.",
    ),
    Context(
        "steel/rare-earth-treated",
        "Rare-earth-treated steel",
        "Cerium and lanthanum form bright oxides, oxysulphides and sulphides.",
    ),
    Context(
        "steel/titanium-stabilised",
        "Titanium-stabilised or microalloyed steel",
        "Titanium nitride and carbonitride cubes, titanium carbosulphide.",
    ),
    Context(
        "steel/free-cutting",
        "Free-cutting steel",
        "Sulphur, lead, bismuth, tellurium or selenium added for machining.",
    ),
    Context("steel/stainless", "Stainless steel", "More than about 10.5 % chromium."),
    Context(
        "steel/stainless/austenitic",
        "Austenitic stainless steel",
        "Austenite with delta ferrite, M23C6 and, after long service, sigma phase.",
    ),
    Context(
        "steel/stainless/ferritic",
        "Ferritic stainless steel",
        "Ferrite with carbonitrides, Laves and sigma phase.",
    ),
    Context(
        "steel/stainless/duplex",
        "Duplex stainless steel",
        "Austenite and ferrite; sigma, chi and nitrides after wrong heat treatment.",
    ),
    Context(
        "steel/stainless/martensitic",
        "Martensitic stainless steel",
        "Martensite with chromium carbides.",
    ),
    Context("steel/tool", "Tool steel", "Hardened steel with primary and secondary carbides."),
    Context("steel/tool/high-speed", "High-speed steel", "M6C and MC carbides in martensite."),
    Context(
        "steel/bearing",
        "Bearing steel",
        "High-carbon chromium steel with M3C and few, harmful oxides.",
    ),
    Context(
        "steel/spring",
        "Spring steel",
        "Silicon or chromium-vanadium steel, sensitive to hard inclusions.",
    ),
    Context(
        "steel/hsla",
        "Microalloyed structural steel",
        "Low carbon, niobium, vanadium and titanium carbonitrides.",
    ),
    Context(
        "steel/hadfield",
        "Austenitic manganese steel",
        "Manganese austenite with carbides at grain boundaries.",
    ),
    Context(
        "steel/heat-treated",
        "Quenched and tempered steel",
        "Tempered martensite with cementite and alloy carbides.",
    ),
    Context(
        "steel/carburised",
        "Carburised steel",
        "Case with martensite, retained austenite and carbides.",
    ),
    Context(
        "steel/nitrided", "Nitrided steel", "Compound layer of iron nitrides, alloy nitrides below."
    ),
    Context("steel/electrical", "Electrical steel", "Silicon steel with few, fine inclusions."),
    Context(
        "steel/maraging",
        "Maraging steel",
        "Nickel martensite with intermetallics and titanium nitride.",
    ),
    Context(
        "steel/slag-entrainment",
        "Entrained slag, mould flux or refractory",
        "Exogenous inclusions in any steel.",
    ),
)

# In one melt the deoxidant that binds oxygen more tightly reduces the oxides of the others.
COEXISTENCE = (
    Coexistence(
        ("Corundum", "Alumina cluster, matrix-filled", "Spinel"),
        ("Wüstite", "Manganese-iron monoxide inclusion"),
        0.2,
        "Aluminium in the melt reduces iron and manganese oxide; both together mean reoxidation or scale "
        "(common practice in clean-steel assessment).",
        ("steel",),
    ),
    Coexistence(
        ("Silica inclusion", "Quartz", "Cristobalite", "Tridymite"),
        ("Corundum", "Spinel"),
        0.2,
        "Silica and alumina react to aluminosilicates; both together mean two sources (phase diagram "
        "Al2O3-SiO2).",
        ("steel",),
    ),
    Coexistence(
        ("Lime", "Calcium oxide inclusion, magnesian"),
        ("Corundum", "Silica inclusion", "Quartz", "Cristobalite"),
        0.05,
        "Lime reacts with alumina to calcium aluminates and with silica to calcium silicates (phase "
        "diagram CaO-Al2O3-SiO2).",
        ("steel",),
    ),
    Coexistence(
        (
            "Iron sulphide film, grain-boundary",
            "Iron oxysulphide inclusion",
            "Pyrrhotite",
            "Troilite",
        ),
        (
            "Calcium sulphide inclusion",
            "Calcium-manganese sulphide inclusion",
            "Cerium-lanthanum oxysulphide",
            "Rare-earth monosulphide",
        ),
        0.05,
        "Calcium and rare earths bind sulphur far more tightly than iron does (free energies of the "
        "sulphides; Turkdogan 1996, Fundamentals of Steelmaking).",
        ("steel",),
    ),
    Coexistence(
        ("Calcium sulphide inclusion",),
        (
            "Silica inclusion",
            "Manganese iron metasilicate inclusion",
            "Manganese-iron monoxide inclusion",
        ),
        0.1,
        "Calcium sulphide forms at oxygen activities far below those at which silica and manganese "
        "silicates do (Turkdogan 1996, Fundamentals of Steelmaking).",
        ("steel",),
    ),
    Coexistence(
        ("Cerium-lanthanum oxysulphide", "Rare-earth monosulphide", "Rare-earth oxide inclusion"),
        (
            "Silica inclusion",
            "Manganese iron metasilicate inclusion",
            "Manganese-iron monoxide inclusion",
        ),
        0.05,
        "Rare earths reduce silica and manganese silicates (free energies of the oxides; Kiessling & "
        "Lange 1978, Non-metallic Inclusions in Steel).",
        ("steel",),
    ),
    Coexistence(
        ("Titanium carbonitride inclusion",),
        ("Manganese-iron monoxide inclusion", "Wüstite"),
        0.2,
        "Titanium that is left to form nitride would have reduced these oxides; common practice.",
        ("steel",),
    ),
)

# Deoxidation decides which family of oxides is there; factors are common practice.
_BY_PRACTICE = {
    "steel/aluminium-killed": ({"Al"}, 2.0),
    "steel/silicon-killed": ({"Si"}, 2.0),
    "steel/calcium-treated": ({"Ca"}, 2.0),
    "steel/rare-earth-treated": ({"La", "Ce", "Nd", "Pr"}, 3.0),
    "steel/titanium-stabilised": ({"Ti"}, 2.0),
}


def practice_factors(situation: Situation) -> NDArray[np.float64] | None:
    """Favour oxides, sulphides and nitrides of the element a steel was treated with."""
    chosen = [_BY_PRACTICE[c] for c in situation.contexts if c in _BY_PRACTICE]
    if not chosen:
        return None
    factors = np.ones(len(situation.phases))
    for i, phase in enumerate(situation.phases):
        if not any(c.split("/")[0] == "steel" for c in phase.contexts):
            continue
        elements = phase.parsed.elements
        for wanted, factor in chosen:
            if elements & wanted and elements & {"O", "S", "N"}:
                factors[i] = max(factors[i], factor)
    return factors


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS


@hookimpl
def register_coexistence() -> Sequence[Coexistence]:
    return COEXISTENCE


@hookimpl
def weigh_candidates(situation: Situation) -> NDArray[np.float64] | None:
    return practice_factors(situation)
