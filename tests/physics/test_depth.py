"""Ranges, depths and radii."""

from __future__ import annotations

import numpy as np
import pytest

from phaseid.errors import InputError
from phaseid.physics import depth
from phaseid.physics.conditions import Coat, Conditions
from phaseid.physics.elements import from_atoms, pure


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


def test_coat_factor_is_one_without_a_coat() -> None:
    stack = np.stack([pure("Al"), pure("Au")])
    np.testing.assert_array_equal(depth.coat_factor(stack, Conditions()), [1.0, 1.0])
    gold = depth.coat_factor(stack, Conditions(coat=Coat("Au", 10)))
    assert gold[0] > 1.05
    # Gold on gold is gold.
    assert gold[1] == pytest.approx(1.0)
