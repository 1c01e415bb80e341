"""Speed of clustering beside the plain script, both in the same run; figures are printed, not asserted.

The plain script's time grows at least in proportion to the pixels; on a quarter of a megapixel it is timed
in full, and a 16-megapixel image of the same kind is timed for ours alone.
"""

from __future__ import annotations

import time

import numpy as np
import pytest

from phaseid.image import scenes
from phaseid.image.clustering import cluster_image
from phaseid.image.reading import from_array
from tests.benchmarks import baseline_clusters as plain

GREYS = [60.0, 100.0, 112.0, 180.0]


def image_of(side: int) -> np.ndarray:
    rng = np.random.default_rng(0)
    small = min(side, 1024)
    scene = scenes.with_blur(scenes.grains((small, small), GREYS, 40, rng), 1.0)
    tile = scenes.record(scene, rng, noise=4.0)
    return np.tile(tile, (side // small, side // small))


def test_ratio_to_the_plain_script(benchmark) -> None:  # type: ignore[no-untyped-def]
    image = image_of(512)
    grey = from_array(image)
    start = time.perf_counter()
    rival = plain.mixture(image, len(GREYS))
    theirs = time.perf_counter() - start
    found = benchmark.pedantic(cluster_image, args=(grey,), rounds=3, warmup_rounds=1)
    benchmark.extra_info["plain_script_seconds"] = theirs
    benchmark.extra_info["times_faster"] = theirs / benchmark.stats.stats.median
    assert len(found.clusters) == len(rival.means) == 4


@pytest.mark.slow
def test_16_megapixels(benchmark) -> None:  # type: ignore[no-untyped-def]
    grey = from_array(image_of(4096))
    found = benchmark.pedantic(cluster_image, args=(grey,), rounds=1)
    benchmark.extra_info["megapixels_per_second"] = 16.8 / benchmark.stats.stats.median
    assert len(found.clusters) == 4


def test_ratio_to_one_filter(benchmark) -> None:  # type: ignore[no-untyped-def]
    """One Gaussian filter over the image, and how many of them the whole clustering takes."""
    from scipy import ndimage

    image = image_of(1024)
    benchmark.pedantic(
        ndimage.gaussian_filter, args=(image.astype(np.float32), 1.5), rounds=3, warmup_rounds=1
    )
    start = time.perf_counter()
    found = cluster_image(from_array(image))
    benchmark.extra_info["clustering_over_one_filter"] = (
        time.perf_counter() - start
    ) / benchmark.stats.stats.median
    assert len(found.clusters) == 4
