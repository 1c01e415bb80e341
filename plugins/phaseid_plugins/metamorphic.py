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
        "rock/metamorphic/contact", "Contact-metamorphic rock", "Andalusite, cordierite, hornfels."
    ),
)

COEXISTENCE = (
    Coexistence(
        ("Quartz",),
        ("Brucite", "Periclase", "Larnite", "Monticellite"),
        0.1,
        "Silica reacts with these to serpentine, forsterite or other silicates (marble reaction series; Bowen 1940).",
    ),
    Coexistence(
        ("Andalusite",),
        ("Kyanite",),
        0.3,
        "Polymorphs of Al2SiO5 with separate stability fields (Holdaway 1971); together only where one is a relic.",
    ),
    Coexistence(
        ("Lawsonite",),
        ("Sillimanite", "Andalusite"),
        0.05,
        "High-pressure low-temperature and low-pressure high-temperature minerals (metamorphic facies, Eskola 1915).",
    ),
)


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS


@hookimpl
def register_coexistence() -> Sequence[Coexistence]:
    return COEXISTENCE
