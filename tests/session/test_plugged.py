"""What plugins say reaches the ranking, and a plugin that fails is told among the warnings."""

from __future__ import annotations

import os
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from phaseid.hooks.host import make_host
from phaseid.hooks.testing import plugin_of
from phaseid.session.knowledge import Knowledge
from phaseid.session.learned import Learned
from phaseid.session.work import Session


@pytest.fixture(scope="module")
def asked():
    """What the plugin below was shown."""
    return []


@pytest.fixture(scope="module")
def plugged(asked):
    """What ships, a plugin that rules calcite out of every cluster but the first, and one that fails."""

    def no_calcite(situation, image):
        asked.append((situation, image))
        return {"Calcite": [1.0, *(0.0 for _ in situation.clusters[1:])], "No such phase": 0.0}

    host = make_host(
        entry_points=False,
        folders=[],
        extra={
            "no calcite": plugin_of(gather_evidence=no_calcite),
            "broken": plugin_of(gather_evidence=lambda image: 1 / 0),
        },
    )
    return Knowledge.load(host=host, learned=Learned(Path(os.devnull).parent / "none" / "x"))


def probabilities(knowledge, scene, name):
    session = Session(knowledge)
    session.state = replace(
        session.with_image(scene), energy_keV=20.0, contexts=("rock/sedimentary",)
    )
    (answer,) = session.answers(with_advice=False)
    candidates = knowledge.candidates(answer.conditions)
    return answer.ranking.probability[:, candidates.index(name)], answer


def test_evidence_of_a_plugin_acts_on_the_clusters_it_names(plugged, knowledge, scene, asked):
    without, _ = probabilities(knowledge, scene, "Calcite")
    with_plugin, answer = probabilities(plugged, scene, "Calcite")
    assert without[1] > 0.005
    assert np.all(with_plugin[1:] == 0)
    situation, image = asked[-1]
    assert image["path"] == str(scene)
    assert len(image["sha256"]) == 64
    assert image["energy_keV"] == 20.0
    assert situation.contexts == ("rock/sedimentary",)
    assert [c.grey_mean for c in situation.clusters] == sorted(c.grey_mean for c in answer.clusters)


def test_a_plugin_that_fails_is_told(plugged, scene):
    probabilities(plugged, scene, "Calcite")
    (notice,) = (n for n in plugged.notices() if "broken" in n.message)
    assert notice.code == "plugin-failed"
    assert "ZeroDivisionError" in notice.message
