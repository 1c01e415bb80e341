"""Regions and runs, against a plain labelling of the whole image."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import ndimage

from phaseid.image import scenes
from phaseid.image.clustering import cluster_image
from phaseid.image.measuring import measure
from phaseid.image.noise import NoiseLaw
from phaseid.image.reading import from_array
from phaseid.image.runs import joined, regions_of, runs_of
from phaseid.image.shading import Shading


@pytest.mark.parametrize("seed", range(4))
def test_regions_agree_with_a_plain_labelling(seed: int) -> None:
    rng = np.random.default_rng(seed)
    labels = (rng.random((70, 90)) * 3.2).astype(np.uint8)
    labels = ndimage.median_filter(labels, 3)
    parts = [runs_of(labels[r : r + 16], r)[0] for r in range(0, 70, 16)]
    runs = joined(parts)
    region, count = regions_of(runs, 90)
    ours = np.zeros(labels.shape, int)
    for r, a, b, k in zip(runs.row, runs.start, runs.stop, region, strict=True):
        ours[r, a:b] = k + 1
    expected = 0
    for k in range(1, int(labels.max()) + 1):
        plain, number = ndimage.label(labels == k, structure=np.ones((3, 3)))
        expected += number
        for n in range(1, number + 1):
            assert len(np.unique(ours[plain == n])) == 1
    assert count == expected
    assert not ours[labels == 0].any()


def test_measures_of_a_known_region() -> None:
    labels = np.ones((600, 80), np.uint8)
    labels[290:310, 20:60] = 2
    data = np.where(labels == 2, 200, 100).astype(np.uint8)
    found = measure(data, labels, NoiseLaw(4.0, 0.0), Shading((600, 80)), 0, (0.0, 255.0), 500.0)
    table = found.regions[found.regions["cluster"] == 2][0]
    assert len(found.regions) == 2
    assert table["pixels"] == 800
    assert table["area_um2"] == pytest.approx(800 * 0.25)
    assert (table["row"], table["column"]) == (299.5, 39.5)
    assert table["elongation"] == pytest.approx(2.0, rel=0.01)
    assert table["angle_deg"] == pytest.approx(0.0, abs=0.1)
    assert table["interior_pixels"] == 16 * 36
    assert table["edge_share"] == pytest.approx(1 - 576 / 800)
    assert table["grey_mean"] == 200.0
    assert table["grey_se"] == pytest.approx(2 / np.sqrt(576))
    assert not table["touches_frame"]
    assert found.regions[found.regions["cluster"] == 1][0]["touches_frame"]
    assert (table["first_row"], table["height"], table["width"]) == (290, 20, 40)


def test_region_errors_are_honest() -> None:
    rng = np.random.default_rng(0)
    scene = scenes.with_blur(scenes.grains((512, 512), [80.0, 140.0], 40, rng), 1.0)
    image = scenes.record(scene, rng, noise=5.0, correlation_px=0.6)
    found = cluster_image(from_array(image))
    table = found.region_table[found.region_table["interior_pixels"] > 60]
    truth = np.array(scene.greys)[table["cluster"] - 1]
    pull = (table["grey_mean"] - truth) / table["grey_se"]
    assert len(pull) > 12
    assert 0.7 < np.sqrt(np.mean(pull**2)) < 1.4


def test_zoned_regions_are_said() -> None:
    rng = np.random.default_rng(0)
    # Grains of one solid solution: each its own composition, over a wide range.
    scene = scenes.with_blur(scenes.grains((640, 640), [60.0], 30, rng, channelling=9.0), 1.0)
    found = cluster_image(from_array(scenes.record(scene, rng, noise=3.0)))
    assert any(c.notes for c in found.clusters)
    assert {"zoned", "channelling"} & {w.code for w in found.warnings}
