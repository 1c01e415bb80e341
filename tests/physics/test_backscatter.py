"""Backscatter coefficients against measurements, published formulas and each other."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from phaseid.errors import InputError
from phaseid.physics import backscatter
from phaseid.physics.averaging import mean_atomic_number
from phaseid.physics.backscatter import BackscatterModel, elemental_eta, eta
from phaseid.physics.detectability import contrast
from phaseid.physics.elements import ELEMENT_COUNT, from_atoms, pure
from tests.physics.measured import PUBLISHED, measured_rows, reference_file, silicate_like

MODELS = [model.name for model in backscatter.models()]
RULES = [rule.name for rule in backscatter.compound_rules()]


@pytest.mark.parametrize(("symbol", "energy_keV", "measured", "source"), PUBLISHED)
def test_default_model_lies_within_the_laboratories_spread(
    symbol: str, energy_keV: float, measured: float, source: str
) -> None:
    predicted = eta(pure(symbol), energy_keV)
    spread = float(backscatter.laboratory_sd(predicted)) * measured
    assert abs(predicted - measured) < 2.5 * spread, source


def test_default_model_scores_as_published_against_all_measured_values() -> None:
    """8.7 % rms and -1 % bias, over every laboratory's value from 5 to 50 keV."""
    path = reference_file("eta_measured.csv")
    if path is None:
        pytest.skip("the table of measured values is not here")
    rows = [row for row in measured_rows(path) if 5 <= row[1] <= 50]
    assert len(rows) > 100
    ratio = np.array([eta(pure(symbol), energy) / value for symbol, energy, value, _ in rows]) - 1
    assert abs(ratio.mean()) < 0.03
    assert np.sqrt((ratio**2).mean()) < 0.10


# Reuter's polynomial worked with four figures; the other literals are the formulas by calculator.
LITERALS = [
    ("reuter-1972", 13, 20.0, 0.1530),
    ("reuter-1972", 14, 20.0, 0.1644),
    ("reuter-1972", 79, 20.0, 0.4870),
    ("hunger-kuchler-1979", 29, 20.0, 0.3019),
    ("august-wernisch-1989", 29, 20.0, 0.3034),
    ("love-scott-1978", 29, 20.0, 0.3079),
    ("pouchou-pichoir-1991", 29, 20.0, 0.3087),
    ("archard-tomlin-1963", 29, 20.0, 0.3112),
    ("arnal-1969", 29, 20.0, 0.3140),
]


@pytest.mark.parametrize(("model", "z", "energy_keV", "expected"), LITERALS)
def test_formulas_give_their_published_values(
    model: str, z: int, energy_keV: float, expected: float
) -> None:
    assert elemental_eta(z, energy_keV, model) == pytest.approx(expected, abs=6e-5)


@pytest.mark.parametrize(
    ("first", "second", "expected", "tolerance"),
    [
        ("Al", "Si", 0.0695, 2e-4),
        ("Fe", "Co", 0.0275, 2e-4),
        ("Pt", "Au", 0.0044, 1e-4),
        ("Al", "Fe", 0.4525, 3e-4),
    ],
)
def test_worked_examples_of_contrast(
    first: str, second: str, expected: float, tolerance: float
) -> None:
    """Textbook contrasts between neighbours by Reuter's polynomial."""
    values = [eta(pure(symbol), 20.0, model="reuter-1972") for symbol in (first, second)]
    assert contrast(*values) == pytest.approx(expected, abs=tolerance)


def test_gold_is_brighter_than_silver_and_carbon_is_dark() -> None:
    for model in MODELS:
        carbon, silver, gold = (eta(pure(s), 20.0, model=model) for s in ("C", "Ag", "Au"))
        assert carbon < 0.1 < silver < gold


@pytest.mark.parametrize("model", MODELS)
@pytest.mark.parametrize("energy_keV", [5.0, 20.0, 40.0])
def test_eta_rises_with_atomic_number_from_lithium_to_uranium(
    model: str, energy_keV: float
) -> None:
    values = elemental_eta(np.arange(3, 93), energy_keV, model)
    assert np.all(values > 0)
    assert np.all(values < 0.6)
    # Hunger & Kuchler's cubic in ln Z turns over by a few ten-thousandths near uranium at 5 keV.
    assert np.all(np.diff(values) > -1e-3)


def test_hydrogen_and_helium_give_nothing() -> None:
    for model in MODELS:
        assert np.array_equal(elemental_eta([1, 2], 20.0, model), [0.0, 0.0])


@pytest.mark.parametrize("rule", RULES)
@pytest.mark.parametrize("model", MODELS)
def test_every_rule_leaves_pure_elements_alone(rule: str, model: str) -> None:
    for symbol, z in (("Li", 3), ("Al", 13), ("Au", 79)):
        value = eta(pure(symbol), 20.0, model=model, rule=rule)
        assert value == pytest.approx(float(elemental_eta(z, 20.0, model)), rel=1e-9)


def test_mass_fraction_rule_is_the_weighted_sum() -> None:
    rutile = from_atoms({"Ti": 1, "O": 2})
    expected = rutile[21] * elemental_eta(22) + rutile[7] * elemental_eta(8)
    assert eta(rutile) == pytest.approx(float(expected))


def test_mean_z_rule_puts_the_mean_into_the_formula() -> None:
    barite = from_atoms({"Ba": 1, "S": 1, "O": 4})
    mean = mean_atomic_number(barite)
    assert eta(barite, rule="mass-mean") == pytest.approx(float(elemental_eta(mean)))


@pytest.mark.parametrize(
    ("name", "atoms", "excess"),
    [
        # Simulated: mass-mean +14.5 % against -0.9 % on average for the weighted sum.
        ("barite", {"Ba": 1, "S": 1, "O": 4}, 0.145),
        ("huttonite", {"Th": 1, "Si": 1, "O": 4}, 0.16),
    ],
)
def test_mass_mean_overestimates_light_with_heavy(
    name: str, atoms: dict[str, float], excess: float
) -> None:
    composition = from_atoms(atoms)
    ratio = eta(composition, rule="mass-mean") / eta(composition)
    assert ratio == pytest.approx(1 + excess, abs=0.04), name


def test_many_phases_in_one_call_equal_one_by_one() -> None:
    stack = silicate_like()
    for rule in RULES:
        together = eta(stack, 15.0, 30.0, rule=rule)
        single = [float(eta(row, 15.0, 30.0, rule=rule)) for row in stack]
        np.testing.assert_allclose(together, single)


def test_an_empty_composition_sends_nothing_back() -> None:
    for rule in RULES:
        assert eta(np.zeros(ELEMENT_COUNT), rule=rule) == 0.0


@settings(max_examples=40, deadline=None)
@given(
    shares=st.lists(st.floats(0.0, 1.0), min_size=2, max_size=6),
    seed=st.integers(0, 10_000),
    rule=st.sampled_from(RULES),
)
def test_compounds_lie_between_their_elements(shares: list[float], seed: int, rule: str) -> None:
    chosen = np.random.default_rng(seed).choice(np.arange(2, 92), len(shares), replace=False)
    composition = np.zeros(ELEMENT_COUNT)
    composition[chosen] = np.array(shares) + 1e-3
    composition /= composition.sum()
    by_element = elemental_eta(chosen + 1)
    value = float(eta(composition, rule=rule))
    if rule == "root-mean-square-mean":
        assert 0 <= value <= by_element.max() + 1e-9
    else:
        assert by_element.min() - 2e-3 <= value <= by_element.max() + 2e-3


# eta at 20 keV by tilt, simulated: Al, Cu, Au.
TILT = [
    ("Al", 45.0, 0.256),
    ("Al", 60.0, 0.360),
    ("Cu", 45.0, 0.410),
    ("Cu", 60.0, 0.503),
    ("Au", 45.0, 0.570),
    ("Au", 60.0, 0.634),
]


@pytest.mark.parametrize(("symbol", "tilt_deg", "simulated"), TILT)
def test_tilt_laws_against_simulation(symbol: str, tilt_deg: float, simulated: float) -> None:
    flat = {"Al": 0.158, "Cu": 0.311, "Au": 0.473}[symbol]
    z = {"Al": 13, "Cu": 29, "Au": 79}[symbol]
    for law in backscatter.tilt_laws():
        value = law.tilted(np.array(flat), np.array(float(z)), tilt_deg)
        weak = law.name == "arnal-1969" and z < 25
        assert value == pytest.approx(simulated, rel=0.13 if weak else 0.05), law.name


def test_arnals_law_gives_its_own_values() -> None:
    """(1 + cos 60)^(-9/sqrt 29) = 0.508 for copper."""
    flat = 2.0 ** (-9 / np.sqrt(29))
    law = next(law for law in backscatter.tilt_laws() if law.name == "arnal-1969")
    assert law.tilted(np.array(flat), np.array(29.0), 60.0) == pytest.approx(0.508, abs=5e-4)


def test_tilt_compresses_contrast() -> None:
    flat = contrast(eta(pure("Al")), eta(pure("Au")))
    tilted = contrast(eta(pure("Al"), tilt_deg=60), eta(pure("Au"), tilt_deg=60))
    assert tilted < flat


def test_spread_is_at_least_the_laboratories_and_grows_with_disagreement() -> None:
    gold = backscatter.eta_sd(pure("Au"))
    assert gold >= 0.03 * eta(pure("Au")) * 0.999
    mixed = from_atoms({"Th": 1, "Si": 1, "O": 4})
    relative = backscatter.eta_sd(mixed) / eta(mixed)
    assert 0.05 < relative < 0.15
    assert backscatter.eta_sd(silicate_like()).shape == (5,)


def test_only_defensible_rules_enter_the_spread() -> None:
    _, members = backscatter.eta_ensemble(pure("Fe"))
    used = {rule for _, rule in members}
    assert used == {rule.name for rule in backscatter.defensible_rules()}
    assert {"mass-mean", "everhart-mean", "electron-mean"}.isdisjoint(used)
    assert len(members) == len(MODELS) * len(used)


def test_listings_state_source_validity_and_status() -> None:
    for model in backscatter.models():
        assert model.status == "confirmed"
        assert any(character.isdigit() for character in model.source)
        assert model.note
        low, high = model.z_range
        assert 1 <= low < high <= ELEMENT_COUNT
    assert backscatter.get_model(backscatter.DEFAULT_MODEL).energy_range_keV is not None
    assert backscatter.compound_rules()[0].name == backscatter.DEFAULT_RULE
    for rule in backscatter.compound_rules():
        assert (rule.weights is None) != (rule.mean is None)
        assert rule.source


def test_a_model_of_ones_own_is_taken() -> None:
    linear = BackscatterModel(
        "linear", lambda z, _: 0.005 * z, None, (1.0, 103.0), "nobody", "", "trial"
    )
    assert eta(pure("Fe"), model=linear) == pytest.approx(0.13)


@pytest.mark.parametrize("what", ["model", "rule", "tilt_law"])
def test_unknown_names_are_refused_with_the_known_ones(what: str) -> None:
    with pytest.raises(InputError, match="choose one of"):
        eta(pure("Fe"), tilt_deg=10.0, **{what: "nonsense"})  # type: ignore[arg-type]
