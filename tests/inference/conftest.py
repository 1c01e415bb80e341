"""Small candidate sets with known answers."""

from __future__ import annotations

import numpy as np
import pytest

from phaseid.inference.candidates import CandidateSet
from phaseid.inference.departure import Departure, smooth_departure
from phaseid.inference.observations import Anchor, Observation
from phaseid.inference.ranking import Question


def candidate_set(signals, relative_sd=0.02, composition=None) -> CandidateSet:
    signals = np.asarray(signals, dtype=float)
    count = len(signals)
    content = np.zeros((count, 103), np.float32) if composition is None else composition
    return CandidateSet(
        [f"phase {i}" for i in range(count)],
        np.arange(count),
        signals,
        relative_sd * signals,
        np.ones(count),
        content,
    )


def no_departure(candidates: CandidateSet) -> Departure:
    return smooth_departure(candidates.axis.upper, np.zeros_like, 1.0)


def question(candidates, greys, se=0.3, known=None, departure=None, **more) -> Question:
    observations = [Observation(float(g), se) for g in greys]
    known = known or {}
    anchors = [
        Anchor(
            float(greys[k]),
            se,
            candidates.signal[p : p + 1],
            candidates.own_sd[p : p + 1],
            np.ones(1),
            candidates.names[p],
            observation=k,
        )
        for k, p in known.items()
    ]
    rows = len(candidates.signal)
    defaults = {
        "prior": np.ones(candidates.size),
        "evidence": np.ones((len(greys), rows)),
        "none_evidence": np.ones(len(greys)),
    }
    return Question(
        candidates=candidates,
        departure=departure or no_departure(candidates),
        observations=observations,
        anchors=anchors,
        known=known,
        **{**defaults, **more},
    )


@pytest.fixture
def few() -> CandidateSet:
    return candidate_set([0.05, 0.09, 0.10, 0.16, 0.21, 0.28])
