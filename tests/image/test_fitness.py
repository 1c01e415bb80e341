"""Every doubt about an image has a code, a sentence and a remedy."""

from __future__ import annotations

import io
from dataclasses import replace

import numpy as np
import pytest
from PIL import Image

from phaseid.image import scenes
from phaseid.image.fitness import assess
from phaseid.image.reading import from_array

RNG = np.random.default_rng(0)
SCENE = scenes.with_blur(scenes.grains((384, 384), [100.0, 140.0], 40, RNG), 1.0)
PLAIN = scenes.record(SCENE, RNG, noise=3.0)
OTHER = scenes.record(
    scenes.with_blur(scenes.grains((384, 384), [100.0, 140.0], 40, RNG), 1.0), RNG, noise=3.0
)


def compressed(quality: int) -> np.ndarray:
    stream = io.BytesIO()
    Image.fromarray(PLAIN).save(stream, "JPEG", quality=quality)
    return np.asarray(Image.open(stream))


def recorded(greys: list[float], noise: float = 3.0) -> np.ndarray:
    rng = np.random.default_rng(1)
    scene = scenes.with_blur(scenes.grains((384, 384), greys, 40, rng), 1.0)
    return scenes.record(scene, rng, noise=noise)


IMAGES = {
    "clipped-low": recorded([-5.0, 120.0]),
    "clipped-high": recorded([120.0, 265.0]),
    "comb-histogram": scenes.comb(PLAIN, 60.0, 180.0),
    "lossy-blocks": compressed(70),
    "few-grey-levels": recorded([100.0, 104.0], noise=0.3),
    "narrow-range": recorded([100.0, 110.0], noise=1.0),
    "several-images": np.hstack([PLAIN, OTHER]),
    "info-bar": scenes.with_bar(PLAIN, 40, RNG),
    "noisy": recorded([100.0, 140.0], noise=40.0),
}


def test_a_fit_image_has_no_doubts() -> None:
    assert assess(from_array(PLAIN, detector="BSE", tilt_deg=0.0)) == []


@pytest.mark.parametrize("code", list(IMAGES))
def test_doubts(code: str) -> None:
    found = {f.code: f for f in assess(from_array(IMAGES[code]))}
    assert code in found
    assert found[code].message.endswith(".")
    assert code == "info-bar" or found[code].remedy.endswith(".")


def test_metadata_doubts() -> None:
    image = from_array(PLAIN, detector="SE2", tilt_deg=30.0)
    codes = [f.code for f in assess(image)]
    assert codes == ["secondary-electrons", "tilted"]
    assert [f.code for f in assess(replace(image, detector="BSE", tilt_deg=None))] == []


def test_amount_is_stated() -> None:
    low = next(f for f in assess(from_array(IMAGES["clipped-low"])) if f.code == "clipped-low")
    share = np.mean(IMAGES["clipped-low"] == 0)
    assert f"{share:.1%}" in low.message


@pytest.mark.parametrize("code", ["lossy-blocks", "several-images", "comb-histogram"])
def test_no_false_alarm(code: str) -> None:
    for seed in range(4):
        rng = np.random.default_rng(seed)
        scene = scenes.with_blur(scenes.grains((300, 300), [60.0, 90.0, 200.0], 30, rng), 1.0)
        image = scenes.record(scene, rng, noise=3.0, noise_slope=0.05)
        assert code not in {f.code for f in assess(from_array(image))}


def test_a_crack_across_the_frame_is_no_join():
    """A crack that wanders about a row jumps up and down along the whole frame."""
    rng = np.random.default_rng(5)
    image = np.full((256, 320), 180.0)
    path = 128 + np.cumsum(rng.normal(0, 0.5, 320))
    image[np.abs(np.arange(256)[:, None] - path) < 2.5] = 15.0
    data = np.clip(image + rng.normal(0, 3, image.shape), 0, 255).astype(np.uint8)
    assert "several-images" not in [f.code for f in assess(from_array(data))]
