"""Small features: their share of the signal, and what their density does."""

from __future__ import annotations

import numpy as np
import pytest

from phaseid.errors import InputError
from phaseid.physics.depth import (
    SHAPES,
    electron_range_um,
    feature_fraction,
    feature_relief,
    feature_signal,
    feature_signal_sd,
    highest_energy_keV,
    smallest_feature_um,
)
from phaseid.physics.elements import from_atoms
from phaseid.physics.energy import Detector
from phaseid.physics.trajectories import Bulk, Inclusion, Material, simulate


def test_feature_fraction_grows_from_none_to_all() -> None:
    sizes = np.array([0.0, 0.01, 0.1, 0.3, 1.0, 3.0, 30.0])
    for shape in SHAPES:
        for over_disc in (False, True):
            share = feature_fraction(sizes, 1.6, 1.6, shape=shape, over_disc=over_disc)
            assert share[0] == 0.0
            assert np.all(np.diff(share) >= 0)
    assert feature_fraction(30.0, 1.6, 1.6) == pytest.approx(1.0, abs=0.02)
    # Lower energy, shorter range: the same feature counts for more.
    assert feature_fraction(0.3, 0.5, 0.5) > feature_fraction(0.3, 1.6, 1.6)
    # The mean over the disc includes the blurred rim.
    assert feature_fraction(1.0, 1.6, 1.6, over_disc=True) < feature_fraction(1.0, 1.6, 1.6)


# Other materials, energies and seeds than the tables were made with.
FEATURES = {
    "silica in iron": ({"Si": 1, "O": 2}, 2.4, {"Fe": 1}, 7.87, 15.0),
    "manganese sulphide in iron": ({"Mn": 1, "S": 1}, 3.99, {"Fe": 1}, 7.87, 15.0),
    "titanium nitride in iron": ({"Ti": 1, "N": 1}, 5.4, {"Fe": 1}, 7.87, 15.0),
    "galena in dolomite": ({"Pb": 1, "S": 1}, 7.6, {"Ca": 1, "Mg": 1, "C": 2, "O": 6}, 2.85, 15.0),
}


@pytest.mark.parametrize("name", FEATURES)
def test_feature_signal_against_a_simulation_of_its_own(name: str) -> None:
    inner, inner_density, outer, outer_density, energy_keV = FEATURES[name]
    detector = Detector("ideal")
    feature = Material(from_atoms(inner), inner_density)
    matrix = Material(from_atoms(outer), outer_density)
    own, other = (
        simulate(Bulk(m), energy_keV, electrons=16_000, seed=1).signal(detector)[0]
        for m in (feature, matrix)
    )
    ranges = [
        float(electron_range_um(m.mass_fractions, m.density, energy_keV)) for m in (feature, matrix)
    ]
    for relative in (0.25, 0.8):
        diameter = relative * min(ranges)
        sample = Inclusion(feature, matrix, diameter / 2)
        seen = simulate(sample, energy_keV, electrons=16_000, seed=2).signal(detector)[0]
        predicted = feature_signal(own, other, diameter, *ranges)
        assert predicted == pytest.approx(seen, abs=0.08 * max(own, other))


def test_a_loose_feature_is_darker_and_a_dense_one_brighter_than_its_composition() -> None:
    assert feature_relief(0.4, 2.0, 1.0) < -0.05
    assert feature_relief(0.4, 1.0, 2.0) > 0.05
    assert feature_relief(0.4, 1.0, 1.0) == 0.0
    assert feature_relief(50.0, 1.0, 2.0) == pytest.approx(0.0, abs=0.02)
    assert feature_signal(0.1, 0.1, 0.4, 2.0, 1.0) < 0.095
    assert feature_signal(0.1, 0.2, 1e3, 1.0, 1.0) == pytest.approx(0.1, rel=0.02)


def test_unknown_ranges_and_shapes() -> None:
    assert np.isnan(feature_fraction(1.0, np.nan, 1.0))
    mixed = feature_fraction(np.array([1.0, 2.0]), [np.nan, 1.0], 1.0)
    assert np.isnan(mixed[0])
    assert np.isfinite(mixed[1])
    with pytest.raises(InputError, match="half-sphere"):
        feature_fraction(1.0, 1.0, 1.0, shape="cube")


def test_smallest_feature_inverts_the_fraction() -> None:
    size = smallest_feature_um(1.6, 0.9, 0.9)
    assert feature_fraction(size, 1.6, 0.9) == pytest.approx(0.9, abs=0.02)
    assert smallest_feature_um([1.0, 2.0], 1.0).shape == (2,)


def test_the_energy_at_which_a_small_feature_can_be_judged() -> None:
    """At that energy, and the range it has there, the fraction is the one asked for."""
    energy = float(highest_energy_keV(1.0, 4.0))
    reach = 4.0 * (energy / 20.0) ** 1.67
    assert feature_fraction(1.0, reach, reach) == pytest.approx(0.9, abs=0.02)
    assert 1.0 < energy < 20.0


def test_the_unknown_depth_matters_most_for_middling_sizes() -> None:
    sizes = np.array([0.01, 0.5, 50.0])
    sd = feature_signal_sd(0.07, 0.2, sizes, 2.0, 1.0)
    assert sd.shape == (3,)
    assert sd[1] > 3 * sd[0]
    assert sd[1] > 3 * sd[2]
    assert 0.02 < sd[1] / (0.2 - 0.07) < 0.3
