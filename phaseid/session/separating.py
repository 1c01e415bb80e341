"""Which phases can be told apart at which beam energy: the separation document."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any

import numpy as np

from phaseid.errors import InputError
from phaseid.phases.table import build
from phaseid.physics.detectability import Separation, separate
from phaseid.session.knowledge import Knowledge, given_phase
from phaseid.session.settling import settle
from phaseid.session.state import State

SCHEMA = "phaseid-separation/1"
DEFAULT_ENERGIES = (5.0, 10.0, 15.0, 20.0, 25.0, 30.0)
# More phases make a table nobody reads.
MOST = 12
# Of a context, the phases of the largest weight.
FROM_CONTEXT = 6


def separation(
    state: State,
    texts: Sequence[str],
    *,
    energies_keV: Sequence[float] = DEFAULT_ENERGIES,
    tilts_deg: Sequence[float] = (0.0,),
    noise: float | None = None,
    pixels: float = 1.0,
    knowledge: Knowledge | None = None,
) -> dict[str, Any]:
    """Work out which pairs of phases can be told apart.

    Parameters
    ----------
    state : State
        Coat, detector, model; contexts where no phases are given.
    texts : sequence of str
        Phases or formulas; none takes the leading phases of the contexts.
    energies_keV, tilts_deg : sequence of float
    noise : float, optional
        Standard deviation of a pixel over the mean grey above the dark level.
    pixels : float
        Pixels averaged in each region.
    knowledge : Knowledge or None

    Returns
    -------
    dict
        The document `phaseid-separation/1`.

    Raises
    ------
    InputError
        For fewer than two phases, too many, or conditions that cannot be used.
    """
    knowledge = knowledge or Knowledge.load(state.databases)
    chosen = list(texts)
    if not chosen and state.contexts:
        weights = knowledge.contexts.weights(state.contexts, knowledge.catalogue.phases)
        best = np.argsort(-weights, kind="stable")[:FROM_CONTEXT]
        chosen = [knowledge.catalogue.phases[i].name for i in best]
    if not 2 <= len(chosen) <= MOST:
        raise InputError(f"Give two to {MOST} phases, or a context; {len(chosen)} were given.")
    if noise is not None and not 0 < noise < 10:
        raise InputError(
            f"A noise of {noise:g} cannot be used; give the share of the grey, e.g. 0.03."
        )
    told = replace(state, energy_keV=max(energies_keV))
    conditions, _ = settle(told, [], [], knowledge.model)
    phases = []
    for text in chosen:
        position = knowledge.catalogue.index(text)
        phases.append(
            given_phase(text, knowledge.catalogue)
            if position is None
            else knowledge.catalogue.phases[position]
        )
    table = build(phases, conditions, cached=False)
    middle = np.zeros((len(phases), table.rows.mass_fractions.shape[1]))
    np.add.at(middle, table.rows.phase, table.rows.share[:, None] * table.rows.mass_fractions)
    density = [np.nan if p.density is None else p.density for p in phases]
    found = separate(
        middle,
        density,
        energies_keV=energies_keV,
        tilts_deg=tilts_deg,
        conditions=conditions,
        noise=noise,
        pixels=pixels,
    )
    return {
        "schema": SCHEMA,
        "phases": [
            {"name": p.name, "formula": p.formula, "density": p.density, "hazard": p.hazard}
            for p in phases
        ],
        "detector": conditions.detector.kind,
        "noise": noise,
        "pixels": pixels,
        "pairs": _pairs(found, [p.name for p in phases]),
    }


def _pairs(found: Separation, names: Sequence[str]) -> list[dict[str, Any]]:
    pairs = []
    for i in range(len(names)):
        for j in range(i + 1, len(names)):
            for e, energy in enumerate(found.energies_keV):
                for t, tilt in enumerate(found.tilts_deg):
                    brighter = i if found.signal[e, t, i] >= found.signal[e, t, j] else j
                    pairs.append(
                        {
                            "first": names[i],
                            "second": names[j],
                            "energy_keV": float(energy),
                            "tilt_deg": float(tilt),
                            "brighter": names[brighter],
                            "contrast": _number(found.contrast[e, t, i, j]),
                            "electrons_per_pixel": _number(found.electrons[e, t, i, j]),
                            "noise_ratio": _number(found.noise_ratio[e, t, i, j]),
                            "model_ratio": _number(found.model_ratio[e, t, i, j]),
                            "resolution_um": _number(found.resolution_um[e, i, j]),
                        }
                    )
    return pairs


def _number(value: float) -> float | None:
    return float(f"{float(value):.6g}") if np.isfinite(value) else None
