"""The Monte Carlo against measurements, published formulas, and itself."""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest

from phaseid.errors import InputError
from phaseid.physics.backscatter import (
    BackscatterModel,
    elemental_eta,
    eta,
    eta_ensemble,
    tilt_laws,
)
from phaseid.physics.conditions import Coat
from phaseid.physics.depth import electron_range_um
from phaseid.physics.elements import from_atoms, pure
from phaseid.physics.energy import Detector, mean_energy_fraction, signal
from phaseid.physics.trajectories import (
    Bulk,
    Exits,
    Film,
    Inclusion,
    Interface,
    Material,
    Start,
    simulate,
    simulate_to,
)
from tests.physics.measured import PUBLISHED

DENSITY = {"Be": 1.85, "C": 2.0, "Al": 2.70, "Si": 2.33, "Ti": 4.51, "Fe": 7.87, "Cu": 8.96}
DENSITY |= {"Ag": 10.49, "Au": 19.3, "U": 19.05}
NUMBER = {"Be": 4, "C": 6, "Al": 13, "Si": 14, "Ti": 22, "Fe": 26, "Cu": 29, "Ag": 47, "Au": 79}
NUMBER |= {"U": 92}


def element(symbol: str) -> Material:
    return Material(pure(symbol), DENSITY[symbol])


@cache
def bulk(symbol: str, energy_keV: float = 20.0, tilt_deg: float = 0.0) -> Exits:
    return simulate(Bulk(element(symbol)), Start(energy_keV, tilt_deg), electrons=16_000, seed=7)


# --- against measurements and formulas --------------------------------------------------------


@pytest.mark.parametrize(
    ("symbol", "energy_keV", "measured", "source"),
    [row for row in PUBLISHED if row[1] < 30 or row[0] in ("C", "Al")],
)
def test_eta_lies_within_the_laboratories_spread(
    symbol: str, energy_keV: float, measured: float, source: str
) -> None:
    spread = {"C": 0.13, "Al": 0.10, "Cu": 0.07, "Au": 0.05}[symbol]
    found = bulk(symbol, energy_keV)
    assert abs(found.eta / measured - 1) < 2 * spread + 3 * found.eta_se / measured, source


# An independent simulation with the same cross-sections and a cut-off at 5 % of the energy; its
# statistical error is 0.002 to 0.0035.
INDEPENDENT = {
    ("C", 5.0): 0.070,
    ("C", 20.0): 0.056,
    ("Al", 10.0): 0.169,
    ("Al", 20.0): 0.158,
    ("Si", 20.0): 0.166,
    ("Cu", 5.0): 0.331,
    ("Cu", 20.0): 0.311,
    ("Ag", 20.0): 0.400,
    ("Au", 5.0): 0.465,
    ("Au", 20.0): 0.473,
}


@pytest.mark.parametrize("case", INDEPENDENT)
def test_eta_agrees_with_an_independent_simulation(case: tuple[str, float]) -> None:
    found = bulk(*case)
    allowed = 3 * np.hypot(found.eta_se, 0.003)
    # Electrons that leave with less than 5 % of the energy count here and did not there.
    assert abs(found.eta - 0.002 - INDEPENDENT[case]) < allowed + 0.002


def test_rutherford_alone_is_too_high_for_gold() -> None:
    found = simulate(
        Bulk(element("Au")), 20.0, electrons=10_000, seed=1, cross_section="rutherford"
    )
    assert found.eta == pytest.approx(0.545, abs=0.02)
    assert found.eta > bulk("Au").eta + 0.03


@pytest.mark.parametrize("symbol", ["Be", "C", "Al", "Ti", "Fe", "Ag", "Au", "U"])
def test_eta_from_beryllium_to_uranium_lies_among_the_closed_forms(symbol: str) -> None:
    values, members = eta_ensemble(pure(symbol), 20.0)
    formulas = [
        v
        for v, (model, _) in zip(values, members, strict=True)
        if model != "archard-tomlin-1963" or NUMBER[symbol] > 10
    ]
    found = bulk(symbol)
    margin = 3 * found.eta_se + 0.04 * found.eta
    assert min(formulas) - margin < found.eta < max(formulas) + margin


@pytest.mark.parametrize("symbol", ["C", "Al", "Cu", "Ag", "Au"])
def test_mean_energy_follows_pouchou_and_pichoir(symbol: str) -> None:
    found = bulk(symbol)
    assert found.mean_energy_fraction == pytest.approx(
        float(mean_energy_fraction(found.eta)), rel=0.08
    )


@pytest.mark.parametrize(
    ("symbol", "median"), [("C", 0.61), ("Al", 0.67), ("Fe", 0.75), ("Ag", 0.81), ("Au", 0.85)]
)
def test_median_energy_agrees_with_an_independent_simulation(symbol: str, median: float) -> None:
    assert np.median(bulk(symbol).energy_fraction) == pytest.approx(median, abs=0.025)


@pytest.mark.parametrize("symbol", ["Al", "Cu", "Au"])
def test_tilt_follows_the_published_laws(symbol: str) -> None:
    tilted = bulk(symbol, 20.0, 60.0).eta
    values = [
        float(law.tilted(np.array(bulk(symbol).eta), np.array(float(NUMBER[symbol])), 60.0))
        for law in tilt_laws()
        if law.name != "arnal-1969" or NUMBER[symbol] > 25
    ]
    for value in values:
        assert tilted == pytest.approx(value, rel=0.07)


# eta of unsupported films over that of the bulk, by thickness over range; independent simulation
# at 20 keV. The start is linear in mass thickness and saturation near 0.35 of the range, as
# Niedrig and Reimer describe it (from memory).
FILMS = [
    ("C", 0.1, 0.31),
    ("C", 0.3, 0.95),
    ("Al", 0.2, 0.70),
    ("Cu", 0.1, 0.43),
    ("Au", 0.05, 0.31),
    ("Au", 0.2, 0.91),
]


@pytest.mark.parametrize(("symbol", "relative", "expected"), FILMS)
def test_films_grow_towards_the_bulk(symbol: str, relative: float, expected: float) -> None:
    material = element(symbol)
    full = float(electron_range_um(pure(symbol), material.density, 20.0))
    found = simulate(Film(material, relative * full, None), 20.0, electrons=20_000, seed=3)
    # Both simulations' errors: 2 to 4 % for carbon, 1 % for gold.
    tolerance = 0.03 + 3 * np.sqrt(2) * bulk(symbol).eta_se / bulk(symbol).eta
    assert found.eta / bulk(symbol).eta == pytest.approx(expected, abs=tolerance)
    assert found.depth_um.max() <= relative * full * 1.0001


COMPOUNDS = {
    "SiO2": ({"Si": 1, "O": 2}, 2.65),
    "FeS2": ({"Fe": 1, "S": 2}, 5.01),
    "TiN": ({"Ti": 1, "N": 1}, 5.4),
    "ZrSiO4": ({"Zr": 1, "Si": 1, "O": 4}, 4.65),
    "BaSO4": ({"Ba": 1, "S": 1, "O": 4}, 4.48),
    "PbS": ({"Pb": 1, "S": 1}, 7.6),
}


def test_mass_fraction_rule_is_the_best_and_the_mass_mean_overestimates() -> None:
    """Compound rules against simulated compounds, with the elements' eta simulated too."""
    z = np.array(sorted(NUMBER.values()))
    simulated = np.array([bulk(s).eta for s in sorted(NUMBER, key=NUMBER.__getitem__)])
    # The formula, scaled to the simulation between the simulated elements.
    scale = simulated / elemental_eta(z, 20.0)

    def scaled(numbers: np.ndarray, energy_keV: float) -> np.ndarray:
        correction = np.interp(np.log(numbers), np.log(z), scale)
        return elemental_eta(numbers, energy_keV) * correction

    own = BackscatterModel("simulated", scaled, None, (3.0, 103.0), "this test", "", "trial")
    deviations: dict[str, list[float]] = {"mass-fraction": [], "mass-mean": [], "everhart-mean": []}
    for atoms, density in COMPOUNDS.values():
        composition = from_atoms(atoms)
        found = simulate(Bulk(Material(composition, density)), 20.0, electrons=16_000, seed=5).eta
        for rule, seen in deviations.items():
            seen.append(float(eta(composition, model=own, rule=rule)) / found - 1)
    rms = {rule: float(np.sqrt(np.mean(np.square(seen)))) for rule, seen in deviations.items()}
    assert rms["mass-fraction"] < 0.045
    assert rms["mass-fraction"] < rms["mass-mean"] < rms["everhart-mean"]
    assert np.mean(deviations["mass-mean"]) > 0.02


# --- limits in which the answer is known ------------------------------------------------------


@pytest.mark.parametrize(
    "sample",
    [
        Film(element("Cu"), 0.1, element("Cu")),
        Inclusion(element("Cu"), element("Cu"), 0.2),
        Inclusion(element("Cu"), element("Cu"), 0.3, 0.29),
        Interface(element("Cu"), element("Cu")),
    ],
    ids=["film", "half-sphere", "sphere", "interface"],
)
def test_boundaries_between_equal_materials_change_nothing(sample: Film) -> None:
    found = simulate(sample, 20.0, electrons=12_000, seed=11)
    reference = bulk("Cu")
    assert abs(found.eta - reference.eta) < 3.5 * np.hypot(found.eta_se, reference.eta_se)
    assert found.mean_energy_fraction == pytest.approx(reference.mean_energy_fraction, abs=0.015)


def test_a_huge_feature_is_bulk_and_a_tiny_one_is_not_seen() -> None:
    huge = simulate(Inclusion(element("Al"), element("Fe"), 20.0), 10.0, electrons=8_000, seed=2)
    assert abs(huge.eta - bulk("Al", 10.0).eta) < 4 * huge.eta_se
    tiny = simulate(Inclusion(element("Al"), element("Fe"), 1e-4), 10.0, electrons=8_000, seed=2)
    assert abs(tiny.eta - bulk("Fe", 10.0).eta) < 4 * tiny.eta_se


def test_an_interface_lies_between_its_sides_and_blurs_within_the_radius() -> None:
    sample = Interface(element("Al"), element("Cu"))
    low, high = bulk("Al").eta, bulk("Cu").eta
    far = [
        simulate(sample, Start(20.0, position_um=(x, 0.0)), electrons=8_000, seed=4).eta
        for x in (-4.0, 1.5)
    ]
    assert far[0] == pytest.approx(low, abs=0.015)
    assert far[1] == pytest.approx(high, abs=0.02)
    middle = simulate(sample, 20.0, electrons=8_000, seed=4).eta
    assert low + 0.02 < middle < high - 0.02


def test_a_slanting_beam_leaves_forwards() -> None:
    found = bulk("Cu", 20.0, 60.0)
    assert found.direction[0].mean() > 0.1
    quadrants = found.quadrants()
    assert quadrants[0] > 1.2 * quadrants[2]
    np.testing.assert_allclose(quadrants[1], quadrants[3], rtol=0.12)


# --- what comes out ---------------------------------------------------------------------------


def test_the_result_depends_on_the_seed_alone() -> None:
    arguments = {"electrons": 40_000, "seed": 5}
    one = simulate(Bulk(element("Au")), 5.0, workers=1, **arguments)
    three = simulate(Bulk(element("Au")), 5.0, workers=3, **arguments)
    np.testing.assert_array_equal(one.energy_keV, three.energy_keV)
    np.testing.assert_array_equal(one.position_um, three.position_um)
    other = simulate(Bulk(element("Au")), 5.0, electrons=40_000, seed=6)
    assert not np.array_equal(one.energy_keV[:100], other.energy_keV[:100])


def test_exits_are_physical() -> None:
    found = bulk("Cu")
    assert found.electrons == 16_000
    assert found.complete
    assert np.all((found.energy_keV > 0.1) & (found.energy_keV <= 20.0))
    assert np.all(found.direction[2] < 0)
    np.testing.assert_allclose(np.linalg.norm(found.direction, axis=0), 1.0, atol=2e-3)
    assert np.all(found.depth_um >= 0)
    assert np.abs(found.position_um.mean(axis=1)).max() < 0.05
    # Close to a cosine law: mean cosine 0.69 against 0.667.
    assert -found.direction[2].mean() == pytest.approx(0.69, abs=0.015)


def test_distributions_integrate_to_eta() -> None:
    found = bulk("Cu")
    for edges, density in (found.energy_spectrum(), found.angle_spectrum()):
        assert (density * np.diff(edges)).sum() == pytest.approx(found.eta)
    depths = found.depth_quantile_um([0.5, 0.9])
    radii = found.radius_quantile_um([0.5, 0.9])
    full = float(electron_range_um(pure("Cu"), 8.96, 20.0))
    np.testing.assert_allclose(depths / full, [0.12, 0.23], atol=0.015)
    np.testing.assert_allclose(radii / full, [0.16, 0.38], atol=0.03)


def test_detector_signals() -> None:
    found = bulk("Cu")
    assert found.signal(Detector("counting"))[0] == pytest.approx(found.eta)
    energy, se = found.signal(Detector("ideal"))
    assert energy == pytest.approx(found.eta * found.mean_energy_fraction)
    assert 0 < se < found.eta_se * 1.2
    annulus = Detector("ideal", inner_angle_deg=20.0, outer_angle_deg=60.0)
    # A cosine law puts sin^2 60 - sin^2 20 = 0.633 of the electrons there.
    assert found.signal(annulus)[0] / energy == pytest.approx(0.633, abs=0.05)
    assert found.quadrants(annulus).sum() == pytest.approx(found.signal(annulus)[0])


@pytest.mark.parametrize("symbol", ["C", "Cu", "Au"])
def test_closed_form_of_the_threshold_against_simulated_energies(symbol: str) -> None:
    """The assumed shape of the energy distribution in `Detector.mean_response`."""
    found = bulk(symbol)
    for threshold in (2.0, 5.0):
        detector = Detector(threshold_keV=threshold)
        closed = float(detector.mean_response(found.mean_energy_fraction, 20.0)) * found.eta
        assert closed == pytest.approx(found.signal(detector)[0], rel=0.02)


def test_a_thin_wide_beam_covers_its_disc() -> None:
    beam = Start(5.0, position_um=(3.0, -2.0), diameter_um=4.0)
    found = simulate(Bulk(element("Au")), beam, electrons=8_000, seed=1)
    x, y = found.position_um - np.array([[3.0], [-2.0]])
    # Even filling: the mean squared radius is half the radius squared.
    assert np.mean(x**2 + y**2) == pytest.approx(2.0, rel=0.08)


def test_the_wanted_error_is_reached() -> None:
    found = simulate_to(Bulk(element("Al")), 10.0, eta_se=0.003, seed=9)
    assert found.eta_se == pytest.approx(0.003, rel=0.15)


def test_progress_is_told_and_stopping_leaves_a_usable_part() -> None:
    told: list[tuple[int, int]] = []
    sample = Bulk(element("Au"))
    whole = simulate(
        sample, 5.0, electrons=50_000, workers=1, progress=lambda *now: told.append(now)
    )
    assert told[-1] == (50_000, 50_000)
    assert [done for done, _ in told] == sorted(done for done, _ in told)
    part = simulate(sample, 5.0, electrons=50_000, workers=1, stop=lambda: True)
    assert not part.complete
    assert 0 < part.electrons < 50_000
    np.testing.assert_array_equal(part.energy_keV, whole.energy_keV[: len(part.energy_keV)])


def test_an_interruption_passes_through() -> None:
    def interrupt(done: int, total: int) -> None:
        raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        simulate(Bulk(element("Au")), 5.0, electrons=40_000, progress=interrupt)


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ({"start": 0.05}, "cut-off"),
        ({"start": 300.0}, "at most 100"),
        ({"start": Start(20.0, 89.0)}, "tilt"),
        ({"electrons": 0}, "at least one"),
        ({"workers": 0}, "at least one"),
        ({"cross_section": "magic"}, "browning"),
        ({"cutoff_keV": 0.01}, "cut-off"),
    ],
)
def test_wrong_simulations_are_refused(arguments: dict[str, object], words: str) -> None:
    with pytest.raises(InputError, match=words):
        simulate(Bulk(element("Fe")), **{"start": 20.0, "electrons": 10} | arguments)  # type: ignore[arg-type]


def test_wrong_samples_are_refused() -> None:
    iron = element("Fe")
    with pytest.raises(InputError, match="density"):
        Material(pure("Fe"), 0.0)
    with pytest.raises(InputError, match="not empty"):
        Material(np.zeros(103), 5.0)
    with pytest.raises(InputError, match="thickness"):
        Film(iron, 0.0, None)
    with pytest.raises(InputError, match="radius"):
        Inclusion(iron, iron, float("inf"))
    with pytest.raises(InputError, match="above the surface"):
        Inclusion(iron, iron, 1.0, -2.0)
    with pytest.raises(InputError, match="standard error"):
        simulate_to(Bulk(iron), 20.0, eta_se=0.0)


@pytest.mark.parametrize(
    ("coat", "under", "energy_keV", "tilt_deg"),
    [
        (Coat("C", 40.0), "Fe", 8.0, 0.0),
        (Coat("Pt", 6.0), "Al", 12.0, 0.0),
        (Coat("Au-Pd", 8.0), "Si", 15.0, 0.0),
        (Coat("C", 40.0), "Fe", 8.0, 45.0),
    ],
)
def test_coat_table_against_a_simulation_of_its_own(
    coat: Coat, under: str, energy_keV: float, tilt_deg: float
) -> None:
    """Materials, thicknesses and energies that the table does not hold."""
    film = Film(
        Material(coat.mass_fractions, coat.density), coat.thickness_nm * 1e-3, element(under)
    )
    start = Start(energy_keV, tilt_deg)
    detector = Detector("ideal")
    with_coat, se = simulate(film, start, electrons=40_000, seed=8).signal(detector)
    bare, bare_se = simulate(Bulk(element(under)), start, electrons=40_000, seed=9).signal(detector)
    predicted = signal(pure(under), energy_keV, tilt_deg, detector=detector, coat=coat) / signal(
        pure(under), energy_keV, tilt_deg, detector=detector
    )
    noise = np.hypot(se / with_coat, bare_se / bare)
    assert abs(with_coat / bare / predicted - 1) < 3 * noise + 0.03
