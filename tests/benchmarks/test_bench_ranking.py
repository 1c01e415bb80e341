"""Speed of ranking, prediction and start-up, each beside what one would write first. No time is asserted."""

from __future__ import annotations

import subprocess
import sys

import numpy as np
import pytest

from phaseid.inference.ranking import rank

from ..conftest import ROOT
from ..inference.conftest import candidate_set, question

PHASES, CLUSTERS = 1000, 8


@pytest.fixture(scope="module")
def problem():
    rng = np.random.default_rng(0)
    signals = np.exp(rng.normal(np.log(0.16), 0.45, PHASES)).clip(0.03, 0.42)
    candidates = candidate_set(signals)
    chosen = np.sort(rng.choice(signals, CLUSTERS, replace=False))
    greys = 15 + 600 * chosen
    _ = candidates.kernels
    known = {
        0: int(np.argmin(abs(signals - chosen[0]))),
        7: int(np.argmin(abs(signals - chosen[7]))),
    }
    return question(candidates, greys, known=known)


def by_loop(ask, scales=300):
    """The formula as a loop over values of the scale and over the phases, as one would write it first."""
    candidates = ask.candidates
    greys = np.array([o.grey_mean for o in ask.observations])
    total = np.zeros((len(greys), candidates.size))
    rng = np.random.default_rng(0)
    for gain, offset in zip(rng.normal(600, 12, scales), rng.normal(15, 3, scales), strict=True):
        like = np.zeros_like(total)
        for p in range(candidates.size):
            sd = np.sqrt(0.3**2 + (gain * candidates.own_sd[p]) ** 2)
            gap = (greys - offset - gain * candidates.signal[p]) / sd
            like[:, p] = np.exp(-0.5 * gap**2) / sd
        weight = np.prod(like.sum(axis=1))
        total += weight * like / (like.sum(axis=1, keepdims=True) + 1e-300)
    return total


@pytest.mark.benchmark(group="rank 8 clusters against 1,000 phases")
def test_ranking(benchmark, problem):
    answer = benchmark(rank, problem)
    assert answer.probability.shape == (CLUSTERS, PHASES)


@pytest.mark.benchmark(group="rank 8 clusters against 1,000 phases")
def test_ranking_by_loop(benchmark, problem):
    total = benchmark.pedantic(by_loop, (problem, 30), rounds=2)
    assert total.shape == (CLUSTERS, PHASES)


@pytest.mark.benchmark(group="start-up")
@pytest.mark.parametrize("words", ["--help", "--version"])
def test_start_up(benchmark, words):
    code = f"from phaseid.cli.main import run; run(['{words}'])"
    done = benchmark.pedantic(
        subprocess.run,
        ([sys.executable, "-c", code],),
        {"cwd": ROOT, "capture_output": True, "check": True},
        rounds=3,
    )
    assert done.returncode == 0
