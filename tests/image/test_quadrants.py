"""Four quadrants of one field: composition from the sum, slopes from the differences."""

from __future__ import annotations

import numpy as np
import pytest

from phaseid.errors import InputError
from phaseid.image.clustering import cluster_image
from phaseid.image.quadrants import combine
from phaseid.image.reading import from_array
from phaseid.physics.detector import Detector
from phaseid.physics.quadrants import differences


def field(noise=2.0, slope=20.0):
    """Two phases, and a strip that slopes to the right."""
    rng = np.random.default_rng(0)
    base = np.where(np.arange(240)[None, :] < 120, 90.0, 160.0) * np.ones((200, 1))
    tilt = np.zeros_like(base)
    tilt[80:120] = slope
    x, y = differences(tilt, np.zeros_like(tilt), Detector())
    parts = [base * (1 + x), base * (1 + y), base * (1 - x), base * (1 - y)]
    return [from_array((p + rng.normal(0, noise, p.shape)).astype(np.float32)) for p in parts]


def test_slopes_are_found_and_left_out():
    found = combine(field())
    assert found.sloped[84:116].mean() > 0.95
    assert found.sloped[:70].mean() < 0.01
    assert np.median(found.slope_deg[90:110]) == pytest.approx(20, abs=2)
    assert "slopes" in [f.code for f in found.composition.flags]
    clusters = cluster_image(found.composition).clusters
    assert [round(c.grey_mean) for c in clusters] == [90, 160]
    assert not cluster_image(found.composition).labels[90:110].any()


def test_flat_field_is_kept_whole_and_quieter():
    images = field(slope=0.0)
    found = combine(images)
    assert found.sloped.mean() < 0.01
    assert found.composition.data[:, :100].std() == pytest.approx(1.0, rel=0.1)


def test_wrong_quadrants_are_refused():
    images = field()
    with pytest.raises(InputError, match="Four quadrants"):
        combine(images[:3])
    with pytest.raises(InputError, match="differ in size"):
        combine([*images[:3], from_array(images[3].data[:100])])
    with pytest.raises(InputError, match="dark level"):
        combine(images, dark=500.0)
