"""What is known of a few real images, where they are at hand."""

from __future__ import annotations

import os
from pathlib import Path

import numpy as np
import pytest

from phaseid.image.clustering import Clustering, cluster_image
from phaseid.image.reading import GreyImage, read_image

FOLDER = (
    Path(os.environ.get("PHASEID_SHARED", Path(__file__).parents[2] / ".." / "shared")) / "images"
)

pytestmark = [
    pytest.mark.realimage,
    pytest.mark.skipif(not FOLDER.is_dir(), reason="the real images are not here"),
]


def opened(name: str) -> tuple[GreyImage, Clustering]:
    image = read_image(FOLDER / name)
    return image, cluster_image(image)


def codes(found: Clustering) -> set[str]:
    return {w.code for w in found.warnings}


def test_glass_with_sand_and_bubbles() -> None:
    _, found = opened("glass_sand_bubbles_15kV.png")
    assert found.crop[:2] == (0, 884)
    bubbles, sand, glass = found.clusters
    assert bubbles.kind == "void"
    assert bubbles.clipped == "low"
    assert sand.grey_mean == pytest.approx(101, abs=4)
    assert glass.grey_mean == pytest.approx(131, abs=2)
    shares = [c.area_fraction for c in found.clusters]
    np.testing.assert_allclose(shares, [0.196, 0.214, 0.591], atol=0.02)
    assert {"info-bar", "clipped-low"} <= codes(found)


def test_one_alloy_in_its_mount() -> None:
    image, found = opened("alloy718_bse_30kV.tif")
    assert image.energy_keV == 30.0
    assert image.pixel_size_nm == pytest.approx(1009.11)
    assert image.detector is not None
    assert "BSE" in image.detector
    assert found.crop == (0, 1024, 0, 1536)
    large = [c for c in found.clusters if c.area_fraction > 0.01]
    assert [c.kind for c in large] == ["void", "phase"]
    assert large[0].grey_mean < 40
    assert large[1].grey_mean == pytest.approx(210, abs=3)
    # Carbides, bright specks of a few pixels, are really there; nothing else is.
    assert len(found.clusters) <= 3


def test_coating_on_silicon() -> None:
    _, found = opened("coating_a.png")
    void, silicon, silicate = found.clusters
    assert void.kind == "void"
    assert void.grey_mean == pytest.approx(28, abs=6)
    assert silicon.grey_mean == pytest.approx(70, abs=6)
    assert silicate.grey_mean == pytest.approx(222, abs=6)
    # The grown oxide differs from its substrate by a few levels only: it cannot be told, and that is said.
    assert any("cannot be told" in n for n in silicon.notes)


def test_coating_over_shaded_resin() -> None:
    _, found = opened("coating_b.png")
    assert [c.kind for c in found.clusters[:2]] == ["void", "void"]
    phases = found.phases
    assert [round(c.grey_mean) for c in phases[:2]] == [
        pytest.approx(109, abs=4),
        pytest.approx(195, abs=3),
    ]
    assert len(phases) <= 3


def test_cement_without_clear_peaks() -> None:
    _, found = opened("cement_paste.png")
    pores, hydrates, clinker = found.clusters
    assert pores.kind == "void"
    assert pores.grey_mean < 30
    assert hydrates.grey_mean == pytest.approx(93, abs=3)
    assert clinker.grey_mean == pytest.approx(153, abs=5)
    assert clinker.area_fraction == pytest.approx(0.06, abs=0.03)
