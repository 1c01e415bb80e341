"""A small invented scene on disk, and a session on it."""

from __future__ import annotations

import numpy as np
import pytest
import tifffile

from phaseid.image.scenes import grains, record, with_blur
from phaseid.physics.conditions import Conditions
from phaseid.physics.elements import from_atoms
from phaseid.physics.signals import signal_under
from phaseid.session.work import Session

# Quartz, calcite, magnetite, galena.
TRUTH = {
    "Quartz": {"Si": 1, "O": 2},
    "Calcite": {"Ca": 1, "C": 1, "O": 3},
    "Magnetite": {"Fe": 3, "O": 4},
}


def scene_greys() -> np.ndarray:
    signals = signal_under(np.stack([from_atoms(a) for a in TRUTH.values()]), Conditions())
    return 20 + 1300 * signals


@pytest.fixture(scope="session")
def scene(tmp_path_factory):
    """Path of an image with three phases, 20 keV."""
    rng = np.random.default_rng(3)
    made = with_blur(grains((192, 192), list(scene_greys()), 32, rng), 0.7)
    path = tmp_path_factory.mktemp("scene") / "scene.tif"
    tifffile.imwrite(path, record(made, rng, noise=3.0))
    return path


@pytest.fixture
def session(scene, small_knowledge):
    from dataclasses import replace

    made = Session(small_knowledge)
    made.state = replace(made.with_image(scene), energy_keV=20.0, contexts=("rock/sedimentary",))
    return made
