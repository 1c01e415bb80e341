"""The signal axis and the smooth departure."""

from __future__ import annotations

import numpy as np
import pytest

from phaseid.inference.axis import SignalAxis
from phaseid.inference.departure import smooth_departure


def test_kernels_integrate_to_one_and_keep_their_moments():
    axis = SignalAxis(0.5)
    signal, sd = np.array([0.06, 0.2, 0.4]), np.array([0.003, 0.004, 0.02])
    kernels = axis.kernels(signal, sd).astype(float)
    np.testing.assert_allclose(kernels @ axis.widths, 1.0, rtol=1e-5)
    mean = (kernels * axis.nodes) @ axis.widths
    np.testing.assert_allclose(mean, signal, rtol=2e-3)
    spread = np.sqrt((kernels * (axis.nodes - mean[:, None]) ** 2) @ axis.widths)
    np.testing.assert_allclose(spread, sd, rtol=0.06)


def test_draws_follow_the_density():
    axis = SignalAxis(0.5)
    density = axis.kernels(np.array([0.1, 0.3]), np.array([0.01, 0.02])).astype(float).sum(axis=0)
    drawn = axis.draw(density, (np.arange(20000) + 0.5) / 20000)
    assert np.mean(drawn < 0.2) == pytest.approx(0.5, abs=0.01)
    assert np.std(drawn[drawn > 0.2]) == pytest.approx(0.02, rel=0.05)


def test_look_up_is_linear_between_nodes():
    axis = SignalAxis(0.5)
    below, share, inside = axis.locate(np.array([-0.1, 0.0, axis.nodes[7], 0.123, 0.9]))
    assert inside.tolist() == [False, True, True, True, False]
    at = axis.nodes[below] + share * (axis.nodes[below + 1] - axis.nodes[below])
    np.testing.assert_allclose(at[1:4], [0.0, axis.nodes[7], 0.123], atol=1e-12)


def test_departure_has_the_stated_size_and_correlation():
    departure = smooth_departure(0.5, lambda s: 0.05 * s, 0.5)
    curves = departure.curves(np.random.default_rng(0).standard_normal((40000, departure.terms)))
    at = {s: np.interp(s, departure.knots, np.arange(len(departure.knots))) for s in (0.1, 0.2)}
    low, high = (curves[:, round(at[s])] for s in (0.1, 0.2))
    assert low.std() == pytest.approx(0.005, rel=0.05)
    assert high.std() == pytest.approx(0.010, rel=0.05)
    expected = np.exp(-0.5 * (np.log(0.22 / 0.12) / 0.5) ** 2)
    assert np.corrcoef(low, high)[0, 1] == pytest.approx(expected, abs=0.03)


def test_undo_inverts_the_departure():
    departure = smooth_departure(0.5, lambda s: 0.08 * s, 0.4)
    curves = departure.curves(np.random.default_rng(1).standard_normal((200, departure.terms)))
    true = np.linspace(0.02, 0.45, 200)
    apparent = departure.undo(curves, true)
    error = np.abs(apparent + departure.at(curves, apparent)[0] - true)
    # Curves of three standard deviations bend almost back on themselves; they may miss a little.
    assert np.quantile(error, 0.98) < 1e-4
    assert error.max() < 0.01


def test_no_departure_is_no_departure():
    departure = smooth_departure(0.5, np.zeros_like, 0.5)
    assert not departure.basis.any()
