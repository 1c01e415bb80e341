"""Clusters on scenes whose truth is known: quick versions of the benchmark script's points."""

from __future__ import annotations

import numpy as np
import pytest

from phaseid.errors import InputError
from phaseid.image import scenes
from phaseid.image.clustering import Clustering, cluster_image
from phaseid.image.reading import from_array
from tests.benchmarks import cluster_scenes as cases
from tests.benchmarks.cluster_scenes import Case


def clustered(case: Case) -> Clustering:
    return cluster_image(from_array(case.image))


def errors(found: Clustering, case: Case) -> np.ndarray:
    return np.array([c.grey_mean for c in found.clusters]) - np.sort(case.scene.greys)


def codes(found: Clustering) -> set[str]:
    return {w.code for w in found.warnings}


@pytest.mark.parametrize("grain", [20, 40])
@pytest.mark.parametrize("step", [0.5, 1.0, 2.0])
def test_buried_phases(grain: int, step: float) -> None:
    case = cases.buried(grain, step, seed=11)
    found = clustered(case)
    assert len(found.clusters) == 3
    assert np.abs(errors(found, case)).max() < 0.1 * cases.NOISE
    # What borders cost: less where grains are large and phases far apart.
    least = {
        (20, 0.5): 0.88,
        (20, 1.0): 0.94,
        (20, 2.0): 0.97,
        (40, 0.5): 0.95,
        (40, 1.0): 0.98,
        (40, 2.0): 0.985,
    }
    assert cases.right_pixels(found.labels, case) > least[grain, step]


@pytest.mark.parametrize("seed", [0, 1, 2])
def test_standard_errors_are_honest(seed: int) -> None:
    case = cases.buried(40, 1.0, seed)
    found = clustered(case)
    pull = errors(found, case) / [c.grey_se for c in found.clusters]
    assert np.abs(pull).max() < 3.0
    assert max(c.grey_se for c in found.clusters) < 0.05 * cases.NOISE


@pytest.mark.parametrize("seed", range(4))
def test_rare_phase_is_found(seed: int) -> None:
    case = cases.rare(seed)
    found = clustered(case)
    assert len(found.clusters) == 3
    wanted = case.scene.greys[-1]
    nearest = found.nearest(wanted)
    assert abs(nearest.grey_mean - wanted) < 3 * nearest.grey_se + 1.0
    assert nearest.area_fraction < 0.001
    assert any("specks" in n for n in nearest.notes)


@pytest.mark.parametrize("seed", range(3))
def test_no_rare_phase_is_invented(seed: int) -> None:
    assert len(clustered(cases.without_rare(seed)).clusters) == 2


@pytest.mark.parametrize("kind", list(cases.DISTURBANCES))
def test_one_phase_stays_one(kind: str) -> None:
    found = clustered(cases.one_phase(kind, seed=5))
    assert len(found.phases) == 1
    code = cases.DISTURBANCES[kind]
    assert code is None or code in codes(found)
    if kind != "comb":
        phase = found.phases[0]
        # Channelling, and corrections, widen the error; it must cover the truth all the same.
        assert abs(phase.grey_mean - 120) < 3.5 * phase.grey_se + 0.5


def test_channelling_has_the_larger_error() -> None:
    calm = clustered(cases.one_phase("noise", 3)).phases[0]
    grains = clustered(cases.one_phase("channelling", 3)).phases[0]
    assert grains.grey_se > 3 * calm.grey_se


@pytest.mark.parametrize(("kind", "number"), [("edges", 2), ("layers", 2), ("real middle", 3)])
def test_blends_are_no_phase(kind: str, number: int) -> None:
    case = cases.blend(kind, seed=4)
    found = clustered(case)
    assert len(found.clusters) == number
    if kind != "layers":
        assert np.abs(errors(found, case)).max() < 0.1 * cases.NOISE


@pytest.mark.parametrize(
    ("kind", "code"),
    [
        ("shading", "shading"),
        ("shading, large grains", "shading"),
        ("drift", "shading"),
        ("line noise", "line-noise"),
        ("charging bands", "charging-bands"),
    ],
)
def test_shading_goes_and_phases_stay(kind: str, code: str) -> None:
    case = cases.shaded(kind, seed=1)
    found = clustered(case)
    assert len(found.clusters) == 3
    assert code in codes(found)
    assert cases.right_pixels(found.labels, case) > 0.99


@pytest.mark.parametrize("row", [0, 1, 380, 381, 382, 383])
def test_a_jump_at_the_frame_does_no_harm(row: int) -> None:
    rng = np.random.default_rng(0)
    scene = scenes.grains((384, 384), [100.0, 140.0], 40, rng)
    image = scenes.record(scene, rng, noise=4).astype(np.float32)
    image[row:] += 14.0
    found = cluster_image(from_array(image))
    # A row or two that jump are a line, which belongs to no phase.
    assert np.mean(found.labels > 0) > 0.98


def test_a_large_grain_is_no_shading() -> None:
    rng = np.random.default_rng(0)
    scene = scenes.with_blur(scenes.grains((512, 512), [100.0, 108.0], 300, rng), 1.0)
    found = cluster_image(from_array(scenes.record(scene, rng, noise=4)))
    assert len(found.clusters) == 2
    assert "shading" not in codes(found)
    np.testing.assert_allclose([c.grey_mean for c in found.clusters], [100, 108], atol=0.2)


def test_clipped_cluster_is_a_bound() -> None:
    rng = np.random.default_rng(0)
    scene = scenes.with_blur(scenes.grains((384, 384), [-6.0, 120.0, 270.0], 50, rng), 1.0)
    found = cluster_image(from_array(scenes.record(scene, rng, noise=4)))
    assert [c.clipped for c in found.clusters] == ["low", None, "high"]
    assert {"clipped-low", "clipped-high"} <= codes(found)
    assert "bound" in found.clusters[0].notes[-1]


@pytest.mark.parametrize(("bits", "scale"), [(16, 150.0), (32, 1.0)])
def test_16_bits_and_floats(bits: int, scale: float) -> None:
    rng = np.random.default_rng(0)
    greys = [100.0 * scale, 104.0 * scale, 120.0 * scale]
    scene = scenes.with_blur(scenes.grains((512, 512), greys, 40, rng), 1.0)
    found = cluster_image(from_array(scenes.record(scene, rng, noise=4 * scale, bits=bits)))
    np.testing.assert_allclose([c.grey_mean for c in found.clusters], greys, atol=0.2 * scale)


def test_noise_law_and_correlated_noise() -> None:
    rng = np.random.default_rng(0)
    scene = scenes.with_blur(scenes.grains((512, 512), [60.0, 100.0, 160.0], 40, rng), 1.0)
    image = scenes.record(scene, rng, noise=3.0, noise_slope=0.2, correlation_px=0.7)
    found = cluster_image(from_array(image))
    np.testing.assert_allclose([c.grey_mean for c in found.clusters], [60, 100, 160], atol=0.5)
    for grey in (60.0, 160.0):
        assert float(found.noise.sd(grey)) == pytest.approx(np.sqrt(9 + 0.2 * grey), rel=0.12)
    assert found.noise.correlated_pixels > 1.5


def test_bar_is_left_out() -> None:
    rng = np.random.default_rng(0)
    scene = scenes.with_blur(scenes.grains((400, 500), [100.0, 130.0], 40, rng), 1.0)
    found = cluster_image(from_array(scenes.with_bar(scenes.record(scene, rng), 40, rng)))
    assert found.crop == (0, 400, 0, 500)
    assert not found.labels[400:].any()
    assert len(found.clusters) == 2
    assert "info-bar" in codes(found)


def test_result_is_reproducible_and_consistent() -> None:
    case = cases.buried(40, 2.0, seed=2)
    first, second = clustered(case), clustered(case)
    np.testing.assert_array_equal(first.labels, second.labels)
    assert [c.id for c in first.clusters] == [1, 2, 3]
    for cluster in first.clusters:
        assert cluster.pixels == np.count_nonzero(first.labels == cluster.id)
    assert sum(c.area_fraction for c in first.clusters) == pytest.approx(1.0)
    assert first.histogram[1].sum() == np.count_nonzero(first.labels)
    assert len(first.mixture.means) == 3
    np.testing.assert_allclose(first.mixture.weights.sum(), 1.0)


def test_progress_and_interruption() -> None:
    case = cases.buried(40, 2.0, seed=2)
    seen: list[float] = []
    cluster_image(from_array(case.image), progress=lambda share, what: seen.append(share))
    assert seen == sorted(seen)
    assert 0.0 <= seen[0] <= seen[-1] <= 1.0

    def interrupt(share: float, what: str) -> None:
        if share > 0.3:
            raise KeyboardInterrupt

    before = case.image.copy()
    with pytest.raises(KeyboardInterrupt):
        cluster_image(from_array(case.image), progress=interrupt)
    np.testing.assert_array_equal(case.image, before)


def test_small_and_odd_images() -> None:
    rng = np.random.default_rng(0)
    for shape in ((8, 8), (9, 200), (33, 65)):
        image = rng.normal(100, 5, shape).astype(np.uint8)
        found = cluster_image(from_array(image))
        assert len(found.clusters) >= 1
        assert found.labels.shape == shape


def test_number_can_be_forced() -> None:
    case = cases.buried(40, 2.0, seed=2)
    image = from_array(case.image)
    for number in (1, 2, 5):
        found = cluster_image(image, n_clusters=number)
        assert len(found.clusters) == number
        assert "forced-number" in codes(found)
    with pytest.raises(InputError, match="from 1 to"):
        cluster_image(image, n_clusters=0)
