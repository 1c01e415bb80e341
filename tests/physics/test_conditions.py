"""Conditions, coats and their flags."""

from __future__ import annotations

import numpy as np
import pytest

from phaseid.errors import InputError
from phaseid.physics.conditions import Coat, Conditions, coat_materials
from phaseid.physics.energy import Detector


@pytest.mark.parametrize(
    ("text", "material", "thickness_nm"),
    [
        ("C:15", "C", 15.0),
        ("c:15nm", "C", 15.0),
        ("carbon: 20 nm", "C", 20.0),
        ("Au-Pd:8", "Au-Pd", 8.0),
        ("AuPd:8", "Au-Pd", 8.0),
        ("au/pd:7.5", "Au-Pd", 7.5),
        ("Iridium:2", "Ir", 2.0),
    ],
)
def test_coats_are_read(text: str, material: str, thickness_nm: float) -> None:
    assert Coat.parse(text) == Coat(material, thickness_nm)


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("C", "C:15"),
        ("15", "C:15"),
        ("C:thick", "C:15"),
        ("C:", "C:15"),
        ("Unobtainium:5", "choose one of C"),
        ("C:-3", "above 0"),
        ("C:0", "above 0"),
        ("C:nan", "above 0"),
        ("C:99999", "1000"),
    ],
)
def test_unreadable_coats_are_refused_with_the_remedy(text: str, words: str) -> None:
    with pytest.raises(InputError, match=words):
        Coat.parse(text)


def test_coats_round_trip_and_have_a_composition() -> None:
    for material in coat_materials():
        coat = Coat(material, 12.5)
        assert Coat.parse(str(coat)) == coat
        assert coat.mass_fractions.sum() == pytest.approx(1.0)
        assert 1 < coat.density < 23


def test_alloy_densities_follow_from_their_parts() -> None:
    gold, palladium, platinum = (Coat(m, 1).density for m in ("Au", "Pd", "Pt"))
    assert Coat("Au-Pd", 1).density == pytest.approx(1 / (0.6 / gold + 0.4 / palladium), rel=0.01)
    assert Coat("Pt-Pd", 1).density == pytest.approx(
        1 / (0.8 / platinum + 0.2 / palladium), rel=0.02
    )


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ({"energy_keV": 0.0}, "beam energy"),
        ({"energy_keV": float("nan")}, "beam energy"),
        ({"energy_keV": 20000.0}, "beam energy"),
        ({"tilt_deg": -5.0}, "tilt"),
        ({"tilt_deg": 90.0}, "tilt"),
        ({"energy_keV": 3.0, "detector": Detector(threshold_keV=3.0)}, "threshold"),
        ({"model": "nonsense"}, "backscatter model"),
        ({"rule": "nonsense"}, "compound rule"),
    ],
)
def test_wrong_conditions_are_refused(arguments: dict[str, object], words: str) -> None:
    with pytest.raises(InputError, match=words):
        Conditions(**arguments)  # type: ignore[arg-type]


def test_usual_conditions_raise_no_flag() -> None:
    assert Conditions().flags == ()
    assert Conditions(coat=Coat("C", 15)).flags == ()


@pytest.mark.parametrize(
    ("conditions", "code"),
    [
        (Conditions(3.0), "low-energy"),
        (Conditions(3.0), "energy-outside-model"),
        (Conditions(10.0, model="reuter-1972"), "energy-outside-model"),
        (Conditions(tilt_deg=70.0), "steep-tilt"),
        (Conditions(coat=Coat("Au", 10)), "metal-coat"),
    ],
)
def test_limits_are_flagged(conditions: Conditions, code: str) -> None:
    assert code in {flag.code for flag in conditions.flags}


def test_conditions_can_key_a_cache() -> None:
    assert hash(Conditions(coat=Coat("C", 15))) == hash(Conditions(coat=Coat("C", 15)))
    assert Conditions() == Conditions()
    assert np.isfinite(Conditions().energy_keV)
