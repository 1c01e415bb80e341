"""Contrast and the electrons it needs."""

from __future__ import annotations

import numpy as np
import pytest

from phaseid.physics.detectability import contrast, probe_current_pA, rose_electrons


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
    dwell_us = 100.0 * 1e6 / 1e6
    current = probe_current_pA(electrons, 0.3, dwell_us, 0.5)
    assert current == pytest.approx(4.0 / (0.3 * 0.5 * 0.1**2 * 100.0), rel=0.01)
