"""How fast the physics is, against plain forms of the same work in the same run."""

from __future__ import annotations

import random
import time
from typing import Any

import numpy as np
import pytest

from phaseid.physics.conditions import Coat
from phaseid.physics.depth import feature_fraction
from phaseid.physics.elements import ELEMENT_COUNT, pure
from phaseid.physics.energy import signal, signal_ensemble
from phaseid.physics.trajectories import Bulk, Material, simulate, simulate_to
from tests.benchmarks.physics_loop import arguments, follow

COPPER = Material(pure("Cu"), 8.96)
ENERGY_KEV = 20.0


def electrons_per_second(run: Any, electrons: int) -> float:
    start = time.perf_counter()
    run(electrons)
    return electrons / (time.perf_counter() - start)


def abreast(electrons: int, workers: int = 1) -> float:
    return simulate(Bulk(COPPER), ENERGY_KEV, electrons=electrons, workers=workers).eta


def test_trajectories_against_a_loop_over_electrons(capsys: pytest.CaptureFixture[str]) -> None:
    """Same physics, same tables, same moment; the plain loop must lose by far."""
    plain = arguments(COPPER, ENERGY_KEV, as_lists=True)
    random.seed(1)
    counted = follow(500, *plain)
    assert counted / 500 == pytest.approx(abreast(16_384), abs=0.08)
    by_loop = electrons_per_second(lambda n: follow(n, *plain), 1_000)
    one = electrons_per_second(abreast, 65_536)
    two = electrons_per_second(lambda n: abreast(n, workers=2), 131_072)
    lines = [
        f"Cu 20 keV, electrons per second: loop {by_loop:.0f}, abreast {one:.0f} on one thread "
        f"({one / by_loop:.0f} times), {two:.0f} on two"
    ]
    try:
        import numba
    except ImportError:
        numba = None
    if numba is not None:
        compiled = numba.njit(follow)
        arrays = arguments(COPPER, ENERGY_KEV, as_lists=False)
        compiled(10, *arrays)
        by_numba = electrons_per_second(lambda n: compiled(n, *arrays), 20_000)
        lines.append(f"compiled loop {by_numba:.0f} on one thread ({by_numba / one:.1f} times)")
    with capsys.disabled():
        print("\n" + "; ".join(lines))
    assert one > 5 * by_loop


@pytest.mark.benchmark(group="physics")
def test_bench_one_material_to_two_thousandths(benchmark: Any) -> None:
    found = benchmark.pedantic(
        lambda: simulate_to(Bulk(COPPER), ENERGY_KEV, eta_se=0.002), rounds=1, iterations=1
    )
    assert found.eta_se < 0.0022


@pytest.mark.benchmark(group="physics")
def test_bench_ensemble_of_two_thousand_phases(benchmark: Any) -> None:
    shares = np.random.default_rng(1).dirichlet(np.full(ELEMENT_COUNT, 0.05), size=(2000, 9))
    values, _ = benchmark.pedantic(lambda: signal_ensemble(shares), rounds=3, iterations=1)
    assert values.shape == (35, 2000, 9)


@pytest.mark.benchmark(group="physics")
def test_bench_ten_thousand_signals_under_a_coat(benchmark: Any) -> None:
    shares = np.random.default_rng(1).dirichlet(np.full(ELEMENT_COUNT, 0.05), size=10_000)
    values = benchmark.pedantic(
        lambda: signal(shares, coat=Coat("C", 15.0)), rounds=3, iterations=1
    )
    assert np.all(values > 0)


@pytest.mark.benchmark(group="physics")
def test_bench_a_million_small_features(benchmark: Any) -> None:
    """Microseconds each, at most."""
    sizes = np.random.default_rng(1).uniform(0.05, 5.0, 1_000_000)
    fractions = benchmark.pedantic(
        lambda: feature_fraction(sizes, 1.5, 0.9), rounds=1, iterations=1
    )
    assert np.all((fractions > 0) & (fractions <= 1))
