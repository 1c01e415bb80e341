"""Slope from a divided detector."""

from __future__ import annotations

import numpy as np
import pytest

from phaseid.physics.elements import pure
from phaseid.physics.energy import Detector
from phaseid.physics.quadrants import difference_per_slope, differences, slope_deg, slope_error
from phaseid.physics.trajectories import Bulk, Material, Start, simulate

ANNULUS = Detector("ideal", inner_angle_deg=15.0, outer_angle_deg=45.0)


def test_closed_form_equals_the_integral_over_the_annulus() -> None:
    """The cosine law about a tilted normal, summed over directions."""
    slope = np.radians(12.0)
    angle = np.radians(np.linspace(15, 45, 601))[:, None]
    azimuth = np.linspace(-np.pi, np.pi, 1441)[None, :-1]
    towards = np.cos(slope) * np.cos(angle) + np.sin(slope) * np.sin(angle) * np.cos(azimuth)
    weight = towards * np.sin(angle)
    quadrant = np.round(azimuth / (np.pi / 2)).astype(int) % 4
    sums = [float((weight * (quadrant == q)).sum()) for q in range(4)]
    expected = (sums[0] - sums[2]) / (sums[0] + sums[2])
    assert differences(12.0, 0.0, ANNULUS)[0] == pytest.approx(expected, rel=0.01)


def test_slope_is_recovered_whatever_the_direction() -> None:
    slopes, azimuths = np.meshgrid([0.0, 3.0, 20.0, 40.0], [0.0, 45.0, 120.0, 270.0])
    back = slope_deg(*differences(slopes, azimuths, ANNULUS), ANNULUS)
    np.testing.assert_allclose(back, slopes, atol=1e-9)


def test_a_detector_further_out_is_more_sensitive_to_slope() -> None:
    near = Detector(inner_angle_deg=5.0, outer_angle_deg=20.0)
    far = Detector(inner_angle_deg=30.0, outer_angle_deg=60.0)
    assert difference_per_slope(near) < difference_per_slope(far)


@pytest.mark.parametrize(("symbol", "density"), [("Al", 2.7), ("Cu", 8.96), ("Au", 19.3)])
def test_simulated_facets_show_their_slope(symbol: str, density: float) -> None:
    found = simulate(Bulk(Material(pure(symbol), density)), Start(15.0, 25.0), electrons=16_000)
    right, up, left, down = found.quadrants(ANNULUS)
    measured = slope_deg((right - left) / (right + left), (up - down) / (up + down), ANNULUS)
    assert measured == pytest.approx(25.0, abs=6.0)


def test_slope_brightens_light_phases_most() -> None:
    change = slope_error([0.0, 10.0, 30.0], 0.15, 13.0)
    assert change[0] == 0.0
    assert np.all(np.diff(change) > 0)
    # Simulated: aluminium is about 25 % brighter at 30 degrees, gold 7 %.
    assert change[2] == pytest.approx(0.26, abs=0.05)
    assert slope_error(30.0, 0.49, 79.0) == pytest.approx(0.07, abs=0.02)
    assert slope_error(30.0, 0.0, 1.0) == 0.0
