"""Changes by hand keep the clustering consistent."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from PIL import Image

from phaseid.errors import InputError
from phaseid.image import scenes
from phaseid.image.areas import MaskFile, Polygon, Rectangle
from phaseid.image.clustering import Clustering, cluster_image
from phaseid.image.reading import from_array


@pytest.fixture(scope="module")
def found() -> Clustering:
    rng = np.random.default_rng(0)
    scene = scenes.with_blur(scenes.grains((300, 320), [80.0, 110.0, 160.0], 40, rng), 1.0)
    return cluster_image(from_array(scenes.record(scene, rng)))


def check(clustering: Clustering) -> None:
    """What must hold after any change."""
    ids = [c.id for c in clustering.clusters]
    assert ids == list(range(1, len(ids) + 1))
    greys = [c.grey_mean for c in clustering.clusters]
    assert greys == sorted(greys)
    counted = np.bincount(clustering.labels.ravel(), minlength=len(ids) + 1)
    assert [c.pixels for c in clustering.clusters] == list(counted[1:])
    assert sum(c.area_fraction for c in clustering.clusters) == pytest.approx(1.0)
    assert set(np.unique(clustering.region_table["cluster"])) == set(ids)
    assert clustering.region_table["pixels"].sum() == counted[1:].sum()
    assert clustering.histogram[1].sum() == counted[1:].sum()


def test_merge(found: Clustering) -> None:
    merged = found.merge([1, 2])
    check(merged)
    assert len(merged.clusters) == 2
    assert merged.clusters[0].pixels == found.clusters[0].pixels + found.clusters[1].pixels
    check(found)


def test_split_undoes_a_merge(found: Clustering) -> None:
    again = found.merge([1, 2]).split(1, 2)
    check(again)
    assert len(again.clusters) == 3
    assert np.mean(again.labels == found.labels) > 0.97


def test_boundary(found: Clustering) -> None:
    moved = found.move_boundary(2, 1, 100.0)
    check(moved)
    assert moved.clusters[0].pixels > found.clusters[0].pixels
    higher = found.move_boundary(1, 2, 104.0)
    assert higher.clusters[0].pixels > moved.clusters[0].pixels


def test_areas_are_left_out(found: Clustering, tmp_path: Path) -> None:
    mask = np.zeros(found.labels.shape, np.uint8)
    mask[250:] = 255
    path = tmp_path / "mask.png"
    Image.fromarray(mask).save(path)
    rest = found.exclude(
        Rectangle(0, 0, 50, 60),
        Polygon(((100.0, 100.0), (150.0, 100.0), (150.0, 200.0))),
        MaskFile(str(path)),
    )
    check(rest)
    assert not rest.labels[:50, :60].any()
    assert not rest.labels[250:].any()
    assert rest.labels[140, 120] == 0
    assert rest.labels[110, 180] > 0


def test_areas_before_clustering(found: Clustering) -> None:
    mask = np.zeros(found.labels.shape, bool)
    mask[:, :150] = True
    rest = cluster_image(found.image, exclude=[mask])
    check(rest)
    assert not rest.labels[:, :150].any()
    assert len(rest.clusters) == 3


def test_polygon_covers_its_area() -> None:
    mask = Polygon(((10.0, 10.0), (10.0, 50.0), (50.0, 30.0))).mask((64, 64))
    assert mask.sum() == pytest.approx(800, rel=0.03)
    assert mask[15, 30]
    assert not mask[45, 12]


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (lambda c: c.merge([1]), "at least two"),
        (lambda c: c.merge([1, 9]), "no cluster 9"),
        (lambda c: c.split(9), "no cluster 9"),
        (lambda c: c.split(1, 1), "two parts"),
        (lambda c: c.move_boundary(1, 1, 90.0), "two different"),
        (lambda c: c.move_boundary(1, 2, 500.0), "would be empty"),
        (lambda c: c.exclude(Rectangle(900, 0, 5, 5)), "outside the image"),
        (lambda c: c.exclude(Polygon(((0.0, 0.0), (1.0, 1.0)))), "three points"),
        (lambda c: c.exclude(np.ones((4, 4), bool)), "does not match"),
        (lambda c: c.exclude(np.ones(c.labels.shape, bool)), "Nothing of the image"),
    ],
)
def test_bad_changes(found: Clustering, change, words: str) -> None:  # type: ignore[no-untyped-def]
    with pytest.raises(InputError, match=words):
        change(found)
    check(found)
