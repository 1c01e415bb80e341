"""Energies, detector signal and its error."""

from __future__ import annotations

import time

import numpy as np
import pytest

from phaseid.errors import InputError
from phaseid.physics.backscatter import eta
from phaseid.physics.conditions import Coat, Conditions
from phaseid.physics.elements import ELEMENT_COUNT, from_atoms, pure
from phaseid.physics.energy import (
    SIGNAL_SHIFT,
    Detector,
    mean_energy_fraction,
    mean_energy_keV,
    model_error,
    signal,
    signal_ensemble,
    signal_under,
)
from tests.physics.measured import silicate_like


@pytest.mark.parametrize(
    ("symbol", "expected"), [("C", 0.61), ("Al", 0.64), ("Cu", 0.68), ("Au", 0.78)]
)
def test_mean_energies_of_pouchou_and_pichoir(symbol: str, expected: float) -> None:
    """Their formula at measured eta, two decimals."""
    measured = {"C": 0.06, "Al": 0.155, "Cu": 0.31, "Au": 0.51}[symbol]
    assert mean_energy_fraction(measured) == pytest.approx(expected, abs=0.012)
    assert mean_energy_keV(pure(symbol), 20.0) == pytest.approx(20 * expected, abs=0.3)


# Simulated means of the energy fraction, 10 to 20 keV.
@pytest.mark.parametrize(
    ("symbol", "simulated"),
    [("C", 0.60), ("Al", 0.65), ("Fe", 0.715), ("Cu", 0.727), ("Ag", 0.765), ("Au", 0.80)],
)
def test_mean_energies_against_simulation(symbol: str, simulated: float) -> None:
    assert mean_energy_keV(pure(symbol), 20.0) / 20 == pytest.approx(simulated, rel=0.08)


def test_signal_contrast_exceeds_eta_contrast_by_the_energy() -> None:
    """Cu/Al at 20 keV: eta ratio times about 1.12 without and 1.15 with a 2 keV threshold."""
    ratio = eta(pure("Cu")) / eta(pure("Al"))
    free = signal(pure("Cu"), detector=Detector("ideal")) / signal(
        pure("Al"), detector=Detector("ideal")
    )
    assert free / ratio == pytest.approx(1.10, abs=0.04)
    with_threshold = signal(pure("Cu")) / signal(pure("Al"))
    assert free / ratio < with_threshold / ratio < 1.16


def test_counting_without_threshold_gives_eta() -> None:
    counting = Detector("counting")
    np.testing.assert_allclose(
        signal(silicate_like(), detector=counting), eta(silicate_like()), rtol=1e-12
    )


def test_mean_response_is_the_average_over_the_assumed_energies() -> None:
    """The closed form against a sum over the distribution p w^(p-1)."""
    w = (np.arange(200_000) + 0.5) / 200_000
    for kind in ("solid-state", "counting"):
        detector = Detector(kind, threshold_keV=4.0)
        for mean in (0.6, 0.8):
            p = mean / (1 - mean)
            density = p * w ** (p - 1)
            unit = 1.0 if kind == "counting" else 20.0
            expected = np.mean(density * detector.response(20.0 * w)) / unit
            assert detector.mean_response(mean, 20.0) == pytest.approx(expected, rel=1e-4)


def test_signal_never_negative_and_zero_for_nothing() -> None:
    assert signal(np.zeros(ELEMENT_COUNT)) == 0.0
    low = signal(pure("C"), 4.5, detector=Detector(threshold_keV=4.4))
    assert 0 <= low < 1e-2


def test_ensemble_contains_the_default_and_every_combination() -> None:
    values, members = signal_ensemble(silicate_like(), 15.0)
    assert values.shape == (35, 5)
    assert len(set(members)) == 35
    at = members.index(("august-wernisch-1989", "mass-fraction"))
    np.testing.assert_allclose(values[at], signal(silicate_like(), 15.0))
    at = members.index(("arnal-1969", "pouchou-mean"))
    direct = signal(silicate_like(), 15.0, model="arnal-1969", rule="pouchou-mean")
    np.testing.assert_allclose(values[at], direct)


def test_a_table_of_phases_takes_well_under_a_second() -> None:
    shares = np.random.default_rng(1).dirichlet(np.full(ELEMENT_COUNT, 0.05), size=(2000, 9))
    signal_ensemble(shares[:2])
    start = time.perf_counter()
    values, _ = signal_ensemble(shares)
    assert values.shape == (35, 2000, 9)
    assert time.perf_counter() - start < 1.0


def test_own_error_is_zero_for_elements_and_large_for_light_with_heavy() -> None:
    compositions = np.stack(
        [
            pure("Fe"),
            from_atoms({"Si": 1, "O": 2}),
            from_atoms({"Zr": 1, "Si": 1, "O": 4}),
            np.zeros(ELEMENT_COUNT),
        ]
    )
    error = model_error(compositions)
    relative = error.own_sd[:3] / signal(compositions[:3])
    assert relative[0] < 1e-12
    assert 0.005 < relative[1] < 0.03
    assert 0.04 < relative[2] < 0.10
    assert error.own_sd[3] == 0.0


@pytest.mark.parametrize("energy_keV", [5.0, 10.0, 20.0, 30.0])
def test_smooth_error_is_a_few_per_cent_over_a_good_part_of_the_axis(energy_keV: float) -> None:
    error = model_error(pure("Fe"), Conditions(energy_keV))
    assert 0.03 < error.relative_sd < 0.25
    assert 0.2 < error.length < 2.0
    np.testing.assert_allclose(error.smooth_sd([0.0, 0.1]), [0.0, 0.1 * error.relative_sd])


def test_smooth_error_covers_what_the_models_do_to_a_ratio() -> None:
    """Signal ratios Fe/Al and Au/Ag: the models' spread is near the one the sizes imply."""
    implied, seen = [], []
    for light, heavy in (("Al", "Fe"), ("Fe", "Ag"), ("Si", "Ag"), ("Al", "Pb")):
        pair = np.stack([pure(light), pure(heavy)])
        values, members = signal_ensemble(pair)
        chosen = [i for i, (_, rule) in enumerate(members) if rule == "mass-fraction"]
        ratios = np.log(values[chosen, 1] / values[chosen, 0])
        seen.append(np.sqrt(np.mean((ratios - ratios[0]) ** 2)))
        error = model_error(pair)
        step = np.diff(np.log(signal(pair) + SIGNAL_SHIFT))[0]
        correlation = np.exp(-0.5 * (step / error.length) ** 2)
        implied.append(error.relative_sd * np.sqrt(2 * (1 - correlation)))
    ratio = np.array(seen) / np.array(implied)
    assert 0.5 < np.sqrt(np.mean(ratio**2)) < 1.5


# Change under 20 nm of carbon, lower and upper bound over the elements, without a detector
# threshold; simulated independently of the table that ships.
CARBON = [
    ("counting", 20.0, -0.01, 0.0),
    ("counting", 10.0, -0.015, 0.0),
    ("counting", 5.0, -0.07, -0.035),
    ("ideal", 20.0, -0.02, 0.0),
    ("ideal", 10.0, -0.04, -0.02),
    ("ideal", 5.0, -0.14, -0.08),
]


@pytest.mark.parametrize(("kind", "energy_keV", "low", "high"), CARBON)
def test_carbon_coat_against_simulation(
    kind: str, energy_keV: float, low: float, high: float
) -> None:
    detector = Detector(kind)
    for symbol in ("Al", "Fe", "Ag", "Au"):
        bare = signal(pure(symbol), energy_keV, detector=detector)
        coated = signal(pure(symbol), energy_keV, detector=detector, coat=Coat("C", 20))
        assert low <= coated / bare - 1 <= high


def test_a_coat_of_the_same_material_changes_nothing_and_a_thick_one_is_all_that_is_seen() -> None:
    for material in ("C", "Cr", "Au"):
        same = signal(pure(material), coat=Coat(material, 30)) / signal(pure(material))
        assert same == pytest.approx(1.0, abs=1e-9)
    buried = signal(pure("Si"), 5.0, coat=Coat("Au", 500))
    assert buried == pytest.approx(float(signal(pure("Au"), 5.0)), rel=0.02)


def test_a_coat_grows_steadily_from_nothing() -> None:
    changes = [
        float(signal(pure("Si"), 15.0, coat=Coat("Pt", t)) / signal(pure("Si"), 15.0)) - 1
        for t in (0.01, 1.0, 2.0, 4.0, 8.0, 16.0)
    ]
    assert 0 < changes[0] < 2e-3
    assert np.all(np.diff(changes) > 0)
    # Thin coats count in proportion to their thickness.
    assert changes[2] / changes[1] == pytest.approx(2.0, rel=0.1)


def test_tilting_lengthens_the_way_through_the_coat() -> None:
    flat, tilted = (
        signal(pure("Au"), 10.0, t, coat=Coat("C", 20)) / signal(pure("Au"), 10.0, t)
        for t in (0.0, 60.0)
    )
    assert tilted < flat < 1.0


def test_vacuum_under_a_coat_stays_dark() -> None:
    assert signal(np.zeros(ELEMENT_COUNT), coat=Coat("Au", 10)) == 0.0


@pytest.mark.parametrize(("energy_keV", "change"), [(20.0, 0.13), (10.0, 0.38), (5.0, 0.81)])
def test_gold_coat_on_silicon_against_simulation(energy_keV: float, change: float) -> None:
    counting = Detector("counting")
    bare = signal(pure("Si"), energy_keV, detector=counting)
    coated = signal(pure("Si"), energy_keV, detector=counting, coat=Coat("Au", 10))
    assert coated / bare - 1 == pytest.approx(change, rel=0.15, abs=0.01)


def test_signal_under_takes_everything_from_the_conditions() -> None:
    conditions = Conditions(
        12.0, 20.0, Coat("C", 15), Detector("scintillator"), "reuter-1972", "z-fraction-mean"
    )
    direct = signal(
        silicate_like(),
        12.0,
        20.0,
        "reuter-1972",
        "z-fraction-mean",
        Detector("scintillator"),
        Coat("C", 15),
    )
    np.testing.assert_array_equal(signal_under(silicate_like(), conditions), direct)


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ({"kind": "magic"}, "solid-state"),
        ({"threshold_keV": -1.0}, "threshold"),
        ({"threshold_keV": float("nan")}, "threshold"),
        ({"inner_angle_deg": 50.0, "outer_angle_deg": 20.0}, "inner angle"),
        ({"outer_angle_deg": 120.0}, "inner angle"),
    ],
)
def test_wrong_detectors_are_refused(arguments: dict[str, object], words: str) -> None:
    with pytest.raises(InputError, match=words):
        Detector(**arguments)  # type: ignore[arg-type]
