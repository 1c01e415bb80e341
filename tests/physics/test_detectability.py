"""Contrast, the electrons it needs, and which pairs of phases can be told apart."""

from __future__ import annotations

import numpy as np
import pytest

from phaseid.errors import InputError
from phaseid.physics.conditions import Conditions
from phaseid.physics.depth import lateral_radius_um
from phaseid.physics.detectability import contrast, probe_current_pA, rose_electrons, separate
from phaseid.physics.elements import ELEMENT_COUNT, from_atoms, pure
from phaseid.physics.energy import Detector, signal

# Corundum, spinel, manganese sulphide, iron.
PHASES = np.stack(
    [
        from_atoms({"Al": 2, "O": 3}),
        from_atoms({"Mg": 1, "Al": 2, "O": 4}),
        from_atoms({"Mn": 1, "S": 1}),
        pure("Fe"),
    ]
)
DENSITIES = [3.97, 3.58, 3.99, 7.87]


def test_contrast_is_symmetric_and_bounded() -> None:
    assert contrast(0.1, 0.2) == pytest.approx(0.5)
    assert contrast(0.2, 0.1) == pytest.approx(0.5)
    np.testing.assert_array_equal(contrast([0.0, 0.3, 0.0], [0.0, 0.3, 0.1]), [0.0, 0.0, 1.0])


def test_rose_criterion_published_numbers() -> None:
    """2.8 % needs 32 000 electrons per pixel, 0.44 % needs 1.3 million."""
    assert rose_electrons(0.028) == pytest.approx(32_000, rel=0.01)
    assert rose_electrons(0.0044) == pytest.approx(1.3e6, rel=0.02)
    assert rose_electrons(0.0) == np.inf


def test_frame_current_of_a_million_pixels() -> None:
    """4 pA / (eta DQE C^2 t_F) for 1e6 pixels in t_F seconds."""
    electrons = rose_electrons(0.1)
    current = probe_current_pA(electrons, 0.3, dwell_us=100.0, efficiency=0.5)
    assert current == pytest.approx(4.0 / (0.3 * 0.5 * 0.1**2 * 100.0), rel=0.01)


def test_pairs_have_the_contrast_of_their_signals() -> None:
    table = separate(PHASES, DENSITIES, energies_keV=[10, 20], tilts_deg=[0, 40])
    assert table.contrast.shape == (2, 2, 4, 4)
    expected = contrast(signal(PHASES[0], 20.0), signal(PHASES[3], 20.0))
    assert table.contrast[1, 0, 0, 3] == pytest.approx(float(expected))
    np.testing.assert_array_equal(table.contrast, np.swapaxes(table.contrast, 2, 3))
    # Tilting compresses contrast and asks for more electrons.
    assert table.contrast[1, 1, 0, 3] < table.contrast[1, 0, 0, 3]
    assert table.electrons[1, 1, 0, 3] > table.electrons[1, 0, 0, 3]
    assert np.isinf(table.electrons[0, 0, 2, 2])


def test_corundum_and_spinel_cannot_be_told_apart_but_both_from_iron() -> None:
    table = separate(PHASES, DENSITIES, energies_keV=[20], noise=0.05, pixels=100)
    seen = table.visible()[0, 0]
    assert not seen[0, 1]
    assert seen[0, 3]
    assert seen[1, 3]
    # Nor would a better image help: the formulas do not know which of the two is brighter.
    assert table.model_ratio[0, 0, 0, 1] < 1.0
    assert table.model_ratio[0, 0, 0, 3] > 3.0


def test_averaging_pixels_beats_noise() -> None:
    one = separate(PHASES, energies_keV=[20], noise=0.05, pixels=1)
    many = separate(PHASES, energies_keV=[20], noise=0.05, pixels=400)
    np.testing.assert_allclose(many.noise_ratio, 20 * one.noise_ratio)
    # A noise of 1/sqrt(n) per pixel and the electrons the criterion asks for: exactly `ratio` over
    # the noise of one region.
    needed = float(one.electrons[0, 0, 2, 3])
    exact = separate(PHASES, energies_keV=[20], noise=1 / np.sqrt(needed))
    assert exact.noise_ratio[0, 0, 2, 3] == pytest.approx(5.0 / np.sqrt(2))
    assert not separate(PHASES, energies_keV=[20]).visible().any()


def test_resolution_improves_at_low_energy() -> None:
    table = separate(PHASES, DENSITIES, energies_keV=[5, 10, 20, 30])
    assert np.all(np.diff(table.resolution_um[:, 0, 3]) > 0)
    both = lateral_radius_um(PHASES, DENSITIES, 20.0)
    assert table.resolution_um[2, 0, 3] == pytest.approx(float(both[0] + both[3]))
    assert np.isnan(separate(PHASES, [3.97, np.nan, 3.99, 7.87]).resolution_um[0, 0, 1])


def test_the_best_energy_respects_the_wanted_resolution() -> None:
    table = separate(PHASES, DENSITIES, energies_keV=[5, 10, 20, 30])
    free = table.best_energy()
    assert free.shape == (1, 4, 4)
    assert free[0, 2, 2] == -1
    narrow = table.best_energy(resolution_um=0.8)
    fits = table.resolution_um[:, 0, 3] <= 0.8
    assert fits[narrow[0, 0, 3]]
    assert np.all(table.best_energy(resolution_um=1e-3) == -1)


def test_an_energy_below_the_threshold_shows_nothing() -> None:
    conditions = Conditions(detector=Detector("scintillator", threshold_keV=6.0))
    table = separate(PHASES, energies_keV=[5, 20], conditions=conditions)
    assert np.isnan(table.signal[0]).all()
    assert np.isfinite(table.signal[1]).all()


def test_vacuum_stands_apart_from_everything() -> None:
    table = separate(np.stack([np.zeros(ELEMENT_COUNT), pure("C")]), energies_keV=[20])
    assert table.contrast[0, 0, 0, 1] == 1.0
    assert table.model_ratio[0, 0, 0, 1] > 10


def test_wrong_energies_are_refused() -> None:
    with pytest.raises(InputError, match="beam energy"):
        separate(PHASES, energies_keV=[0.2])
