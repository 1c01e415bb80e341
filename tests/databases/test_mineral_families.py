"""The mineral families that ship: they load, carry their hazards, and agree with well-known values."""

from pathlib import Path

import numpy as np
import pytest

from phaseid.phases import database
from phaseid.physics.elements import SYMBOLS

FOLDER = Path(__file__).parents[2] / "databases" / "phaseid_databases"
FAMILIES = (
    "silicates-framework",
    "silicates-chain-sheet",
    "silicates-other",
    "carbonates-evaporites",
    "phosphates-arsenates-vanadates",
    "accessory-oxides",
    "meteorite-planetary",
)
# What a hazard sentence has to name where the element can be present.
NAMED = {
    "Be": "beryllium",
    "Pb": "lead",
    "As": "arsenic",
    "Hg": "mercury",
    "Cd": "cadmium",
    "Tl": "thallium",
    "U": "uranium",
    "Th": "thorium",
}
FIBROUS = (
    "Chrysotile",
    "Riebeckite",
    "Grunerite",
    "Anthophyllite",
    "Tremolite",
    "Actinolite",
    "Erionite-K",
    "Erionite-Na",
    "Erionite-Ca",
)
SILICA = ("Quartz", "Cristobalite", "Tridymite")


@pytest.fixture(scope="module")
def phases():
    return [p for family in FAMILIES for p in database.load(FOLDER / f"{family}.yaml").phases]


def test_names_are_unique(phases):
    names = [n.casefold() for p in phases for n in (p.name, *p.other_names)]
    twice = {n for n in names if names.count(n) > 1}
    assert not twice


@pytest.mark.parametrize(("symbol", "word"), NAMED.items())
def test_a_regulated_element_is_named_in_the_hazard(phases, symbol, word):
    holders = [p for p in phases if symbol in p.parsed.elements]
    silent = [p.name for p in holders if word not in (p.hazard or "").lower()]
    # A trace in a substituting site is named as radioactive rather than by element.
    silent = [n for n in silent if "radioactive" not in _hazard(phases, n)]
    assert not silent


def test_fibres_and_silica_carry_their_caution(phases):
    assert all("dust" in _hazard(phases, n) for n in (*FIBROUS, *SILICA))
    assert all("crystalline silica" in _hazard(phases, n) for n in SILICA)


@pytest.mark.parametrize(
    ("name", "expected"),
    [
        ("Quartz", 10.80),
        ("Calcite", 12.57),
        ("Zircon", 24.84),
        ("Baryte", 37.33),
        ("Magnetite", 21.02),
        ("Uraninite", 82.05),
    ],
)
def test_mean_atomic_number_of_known_minerals(phases, name, expected):
    phase = next(p for p in phases if p.name == name)
    values = _mean_atomic_numbers(phase)
    assert values.min() - 0.05 <= expected <= values.max() + 0.05


@pytest.mark.parametrize(
    ("series", "low", "high"),
    [("Forsterite-fayalite series", 10.58, 18.69), ("Plagioclase", 10.71, 11.94)],
)
def test_a_series_spans_its_end_members(phases, series, low, high):
    phase = next(p for p in phases if p.name == series)
    values = _mean_atomic_numbers(phase)
    assert values.min() == pytest.approx(low, abs=0.05)
    assert values.max() == pytest.approx(high, abs=0.05)


def _mean_atomic_numbers(phase):
    return phase.parsed.extremes() @ np.arange(1, len(SYMBOLS) + 1)


def _hazard(phases, name):
    return (next(p for p in phases if p.name == name).hazard or "").lower()
