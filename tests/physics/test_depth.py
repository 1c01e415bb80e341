"""Ranges, depths and radii."""

from __future__ import annotations

import numpy as np
import pytest

from phaseid.errors import InputError
from phaseid.physics import depth
from phaseid.physics.conditions import Coat, Conditions
from phaseid.physics.elements import from_atoms, pure
from phaseid.physics.energy import Detector
from phaseid.physics.trajectories import Bulk, Inclusion, Material, simulate


@pytest.mark.parametrize(
    ("symbol", "density", "energy_keV", "expected"),
    [
        # Kanaya-Okayama ranges as textbooks table them, in um (from memory, two figures; the
        # formula by calculator agrees).
        ("C", 2.25, 20.0, 4.4),
        ("Al", 2.70, 20.0, 4.2),
        ("Fe", 7.87, 20.0, 1.6),
        ("Cu", 8.96, 20.0, 1.46),
        ("Au", 19.3, 20.0, 0.86),
        ("Al", 2.70, 10.0, 1.32),
        ("Cu", 8.96, 5.0, 0.145),
    ],
)
def test_ranges_of_elements(
    symbol: str, density: float, energy_keV: float, expected: float
) -> None:
    value = depth.electron_range_um(pure(symbol), density, energy_keV)
    assert value == pytest.approx(expected, rel=0.02)


def test_range_of_a_compound_is_the_harmonic_sum() -> None:
    silica = from_atoms({"Si": 1, "O": 2})
    parts = [depth.electron_range_um(pure(s), 2.65, 15.0) for s in ("Si", "O")]
    expected = 1 / (silica[13] / parts[0] + silica[7] / parts[1])
    assert depth.electron_range_um(silica, 2.65, 15.0) == pytest.approx(float(expected))


def test_unknown_density_gives_nan_and_arrays_broadcast() -> None:
    stack = np.stack([pure("C"), pure("Au")])
    value = depth.information_depth_um(stack, [np.nan, 19.3], 20.0)
    assert np.isnan(value[0])
    assert value[1] == pytest.approx(0.23 * 0.86, rel=0.03)


def test_information_depth_stays_below_half_the_range() -> None:
    """The published rule of thumb: escape depth about half the penetration depth."""
    for symbol in ("C", "Al", "Fe", "Ag", "Au"):
        full = depth.electron_range_um(pure(symbol), 5.0, 20.0)
        for share in (0.5, 0.9, 0.95):
            assert depth.information_depth_um(pure(symbol), 5.0, 20.0, share) < 0.5 * full


def test_aluminium_radius_in_micrometres() -> None:
    """Simulated: 90 % leave within 2.0 um of the beam at 20 keV and 0.57 um at 10 keV."""
    assert depth.lateral_radius_um(pure("Al"), 2.7, 20.0) == pytest.approx(2.0, rel=0.06)
    assert depth.lateral_radius_um(pure("Al"), 2.7, 10.0) == pytest.approx(0.6, rel=0.08)


@pytest.mark.parametrize("share", [0.2, 1.0, float("nan")])
def test_an_untabulated_share_is_refused(share: float) -> None:
    with pytest.raises(InputError, match=r"0\.5 to 0\.99"):
        depth.information_depth_um(pure("Al"), 2.7, 20.0, share=share)


def test_depths_and_radii_against_an_independent_simulation() -> None:
    """Fractions of the range at 10 to 20 keV: 50, 90, 95 % in depth, 50 and 90 % in radius."""
    published = {
        "C": (0.16, 0.28, 0.31, 0.24, 0.50),
        "Al": (0.15, 0.27, 0.30, 0.22, 0.46),
        "Cu": (0.12, 0.23, 0.25, 0.16, 0.38),
        "Ag": (0.10, 0.21, 0.24, 0.13, 0.33),
        "Au": (0.09, 0.20, 0.23, 0.11, 0.30),
    }
    for symbol, expected in published.items():
        full = depth.electron_range_um(pure(symbol), 5.0, 15.0)
        found = [
            depth.information_depth_um(pure(symbol), 5.0, 15.0, share) / full
            for share in (0.5, 0.9, 0.95)
        ]
        found += [depth.lateral_radius_um(pure(symbol), 5.0, 15.0, s) / full for s in (0.5, 0.9)]
        np.testing.assert_allclose(found, expected, atol=0.035)


def test_feature_fraction_grows_from_none_to_all() -> None:
    sizes = np.array([0.0, 0.01, 0.1, 0.3, 1.0, 3.0, 30.0])
    for shape in depth.SHAPES:
        for over_disc in (False, True):
            share = depth.feature_fraction(sizes, 1.6, 1.6, shape=shape, over_disc=over_disc)
            assert share[0] == 0.0
            assert np.all(np.diff(share) >= 0)
    assert depth.feature_fraction(30.0, 1.6, 1.6) == pytest.approx(1.0, abs=0.02)
    # Lower energy, shorter range: the same feature counts for more.
    assert depth.feature_fraction(0.3, 0.5, 0.5) > depth.feature_fraction(0.3, 1.6, 1.6)
    # The mean over the disc includes the blurred rim.
    assert depth.feature_fraction(1.0, 1.6, 1.6, over_disc=True) < depth.feature_fraction(
        1.0, 1.6, 1.6
    )


def test_feature_fraction_against_a_simulation_of_its_own() -> None:
    """Another pair of materials, energy and seed than the table's: silica in iron at 15 keV."""
    silica, iron = from_atoms({"Si": 1, "O": 2}), pure("Fe")
    ranges = [
        float(depth.electron_range_um(c, rho, 15.0)) for c, rho in ((silica, 2.4), (iron, 7.87))
    ]
    detector = Detector("ideal")
    inside, matrix = Material(silica, 2.4), Material(iron, 7.87)
    own, other = (
        simulate(Bulk(m), 15.0, electrons=16_000, seed=1).signal(detector)[0]
        for m in (inside, matrix)
    )
    for relative in (0.3, 0.6):
        diameter = relative * ranges[0]
        sample = Inclusion(inside, matrix, diameter / 2)
        seen = simulate(sample, 15.0, electrons=16_000, seed=2).signal(detector)[0]
        simulated = (seen - other) / (own - other)
        assert depth.feature_fraction(diameter, *ranges) == pytest.approx(simulated, abs=0.08)


def test_unknown_ranges_and_shapes() -> None:
    assert np.isnan(depth.feature_fraction(1.0, np.nan, 1.0))
    mixed = depth.feature_fraction(np.array([1.0, 2.0]), [np.nan, 1.0], 1.0)
    assert np.isnan(mixed[0])
    assert np.isfinite(mixed[1])
    with pytest.raises(InputError, match="half-sphere"):
        depth.feature_fraction(1.0, 1.0, 1.0, shape="cube")


def test_smallest_feature_inverts_the_fraction() -> None:
    size = depth.smallest_feature_um(1.6, 0.9, 0.9)
    assert depth.feature_fraction(size, 1.6, 0.9) == pytest.approx(0.9, abs=0.02)
    assert depth.smallest_feature_um([1.0, 2.0], 1.0).shape == (2,)


def test_the_energy_at_which_a_small_feature_can_be_judged() -> None:
    """At that energy, and the range it has there, the fraction is the one asked for."""
    energy = float(depth.highest_energy_keV(1.0, 4.0))
    reach = 4.0 * (energy / 20.0) ** 1.67
    assert depth.feature_fraction(1.0, reach, reach) == pytest.approx(0.9, abs=0.02)
    assert 1.0 < energy < 20.0


def test_coat_factor_is_one_without_a_coat() -> None:
    stack = np.stack([pure("Al"), pure("Au")])
    np.testing.assert_array_equal(depth.coat_factor(stack, Conditions()), [1.0, 1.0])
    gold = depth.coat_factor(stack, Conditions(coat=Coat("Au", 10)))
    assert gold[0] > 1.05
    # Gold on gold is gold.
    assert gold[1] == pytest.approx(1.0)
