"""Following the first advice shrinks the list at least as fast as fixed rules, on a few scenes."""

from __future__ import annotations

import numpy as np

from ..benchmarks.advice_truth import compare, small_world


def test_advice_beats_fixed_rules():
    found = compare(8, small_world(), seed=99)
    advice, _ = found.pop("first advice")
    assert advice[-1] < advice[0] - 0.5
    for bits, _ in found.values():
        # The area under the curve: how fast, not only how far.
        assert np.sum(advice) < np.sum(bits)
