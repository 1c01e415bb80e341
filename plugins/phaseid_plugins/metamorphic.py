"""Metamorphic rocks."""

from __future__ import annotations

from collections.abc import Sequence

from phaseid.hooks import hookimpl
from phaseid.phases.contexts import Coexistence, Context

CONTEXTS = (
    Context("rock/metamorphic", "Metamorphic rock", "Rocks changed in the solid state."),
    Context(
        "rock/metamorphic/pelitic-schist",
        "Pelitic schist and gneiss",
        "Micas, garnet, staurolite, aluminium silicates, quartz, feldspar.",
    ),
    Context(
        "rock/metamorphic/greenschist", "Greenschist", "Chlorite, epidote, actinolite, albite."
    ),
    Context(
        "rock/metamorphic/amphibolite",
        "Amphibolite",
        "Hornblende and plagioclase, garnet, ilmenite, titanite.",
    ),
    Context(
        "rock/metamorphic/granulite",
        "Granulite",
        "Pyroxenes, garnet, plagioclase, cordierite, sillimanite.",
    ),
    Context("rock/metamorphic/eclogite", "Eclogite", "Garnet and omphacite, rutile, kyanite."),
    Context(
        "rock/metamorphic/blueschist", "Blueschist", "Glaucophane, lawsonite, jadeite, aragonite."
    ),
    Context(
        "rock/metamorphic/marble", "Marble", "Calcite, dolomite, forsterite, diopside, tremolite."
    ),
    Context(
        "rock/metamorphic/skarn",
        "Skarn",
        "Grossular-andradite, diopside-hedenbergite, vesuvianite, wollastonite.",
    ),
    Context(
        "rock/metamorphic/serpentinite",
        "Serpentinite",
        "Serpentine minerals, magnetite, brucite; may hold chrysotile.",
    ),
    Context(
        "rock/metamorphic/iron-formation",
        "Iron formation",
        "Magnetite, hematite, quartz, grunerite, siderite.",
    ),
    Context(
        "rock/metamorphic/contact",
        "Contact-metamorphic rock",
        "Hornfels with andalusite, cordierite or pyroxene beside an intrusion.",
    ),
)

_SERPENTINE = ("Antigorite", "Lizardite", "Chrysotile")

COEXISTENCE = (
    Coexistence(
        ("Quartz",),
        ("Brucite", "Periclase", "Larnite", "Monticellite", "Forsterite", "Nepheline"),
        0.1,
        "Silica reacts with these to serpentine, talc, diopside or albite (Bowen 1940, progressive "
        "metamorphism of siliceous limestone and dolomite).",
        ("rock/metamorphic",),
    ),
    Coexistence(
        ("Quartz",),
        _SERPENTINE,
        0.1,
        "Serpentine and quartz react to talc (Evans 1977, metamorphism of alpine peridotite); both "
        "together mean later silicification.",
        ("rock/metamorphic", "rock/igneous/ultramafic"),
    ),
    Coexistence(
        ("Brucite",),
        ("Talc",),
        0.1,
        "Brucite and talc react to antigorite (Evans 1977, metamorphism of alpine peridotite).",
        ("rock/metamorphic", "rock/igneous/ultramafic"),
    ),
    Coexistence(
        ("Wollastonite",),
        ("Dolomite", "Magnesite", "Forsterite"),
        0.1,
        "Wollastonite reacts with dolomite or forsterite to diopside and calcite or monticellite (Bowen "
        "1940).",
        ("rock/metamorphic",),
    ),
    Coexistence(
        ("Quartz",),
        ("Diaspore", "Gibbsite"),
        0.2,
        "Aluminium hydroxide and silica react to kaolinite or pyrophyllite (Hemley et al. 1980).",
        ("rock/metamorphic",),
    ),
    Coexistence(
        ("Andalusite",),
        ("Kyanite",),
        0.3,
        "Polymorphs of Al2SiO5 with separate stability fields (Holdaway 1971); together only where one "
        "is a relic.",
        ("rock/metamorphic",),
    ),
    Coexistence(
        ("Lawsonite", "Glaucophane"),
        ("Sillimanite", "Andalusite", "Cordierite"),
        0.05,
        "Minerals of cold, deep and of hot, shallow metamorphism (metamorphic facies, Eskola 1915).",
        ("rock/metamorphic",),
    ),
    Coexistence(
        ("Graphite",),
        ("Hematite",),
        0.2,
        "Graphite reduces hematite at metamorphic temperatures (French & Eugster 1965).",
        ("rock/metamorphic",),
    ),
)


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS


@hookimpl
def register_coexistence() -> Sequence[Coexistence]:
    return COEXISTENCE
