"""Linking the images of a series."""

from __future__ import annotations

import numpy as np
import pytest

from phaseid.errors import InputError
from phaseid.inference.consistency import refuse_reversed, suspect_anchors
from phaseid.inference.departure import smooth_departure
from phaseid.inference.observations import Anchor
from phaseid.inference.scale import ScaleProblem
from phaseid.inference.series import ImageGreys, link

from .conftest import candidate_set

TRUE = np.array([20, 60, 95, 110, 180, 230.0])


def series(seed, gain_sd, offset_sd, images=25):
    rng = np.random.default_rng(seed)
    made = []
    for i in range(images):
        pick = np.sort(rng.choice(6, rng.integers(3, 6), replace=False))
        gain = 1 + gain_sd * rng.normal() * (i > 0)
        offset = offset_sd * rng.normal() * (i > 0)
        grey = offset + gain * TRUE[pick] + 0.3 * rng.normal(size=len(pick))
        made.append(
            (pick, gain, offset, ImageGreys(grey, np.full(len(pick), 0.3), np.ones(len(pick))))
        )
    return made


def test_families_and_drift_are_found():
    made = series(0, 0.02, 4.0)
    found = link([m[3] for m in made])
    assert len(found.grey) == 6
    for (pick, _, _, _), member in zip(made, found.member, strict=True):
        np.testing.assert_array_equal(member, pick)
    strong = [i for i, m in enumerate(made) if abs(m[2] + (m[1] - 1) * 116) > 6]
    assert found.drifted[strong].mean() > 0.8


def test_still_series_reports_no_drift():
    made = series(1, 0.0, 0.0)
    found = link([m[3] for m in made])
    assert len(found.grey) == 6
    assert not found.drifted.any()
    assert np.abs(found.grey - TRUE).max() < 0.6


def test_single_image_is_its_own_series():
    found = link([ImageGreys(np.array([10.0, 50.0]), np.array([0.2, 0.2]), np.ones(2))])
    np.testing.assert_array_equal(found.member[0], [0, 1])
    np.testing.assert_allclose(found.grey, [10, 50])


def anchor(grey, signal, label):
    return Anchor(grey, 0.3, np.array([signal]), np.array([0.01 * signal]), np.ones(1), label)


def test_reversed_evidence_is_refused():
    departure = smooth_departure(0.5, lambda s: 0.05 * s, 0.5)
    with pytest.raises(InputError, match="quartz must be darker than gold"):
        refuse_reversed([anchor(200, 0.08, "quartz"), anchor(50, 0.4, "gold")], departure)
    refuse_reversed([anchor(50, 0.08, "quartz"), anchor(200, 0.4, "gold")], departure)


def test_reference_that_does_not_fit_the_others_is_named():
    departure = smooth_departure(0.5, lambda s: 0.01 * s, 0.5)
    axis = candidate_set([0.1]).axis
    problem = ScaleProblem(axis, departure, (), np.zeros((0, len(axis))))
    good = [anchor(10 + 1000 * s, s, f"{s}") for s in (0.05, 0.1, 0.2, 0.3)]
    assert suspect_anchors(problem, good) == []
    wrong = [*good[:2], anchor(150.0, 0.2, "wrong"), good[3]]
    assert suspect_anchors(problem, wrong)[0][0].label == "wrong"
