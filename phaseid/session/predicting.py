"""Predictions for formulas and phases: the prediction document."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any

import numpy as np

from phaseid.errors import InputError
from phaseid.phases.records import Phase
from phaseid.phases.table import build
from phaseid.physics.elements import SYMBOLS
from phaseid.physics.signals import eta, mean_energy_keV
from phaseid.session.knowledge import Knowledge, given_phase
from phaseid.session.settling import settle
from phaseid.session.state import State

SCHEMA = "phaseid-predict/1"
DEFAULT_ENERGY_KEV = 20.0


def prediction(
    state: State,
    formulas: Sequence[str],
    *,
    density: float | None = None,
    every_model: bool = False,
    knowledge: Knowledge | None = None,
) -> dict[str, Any]:
    """Predict mean atomic number, eta and signal.

    Parameters
    ----------
    state : State
        Conditions and databases; the beam energy defaults to 20 keV.
    formulas : sequence of str
        Formulas, names of phases, or mixtures such as ``wt% Fe74 Cr18 Ni8``.
    density : float, optional
        g/cm3, for phases of which the databases know none.
    every_model : bool
        Whether eta under every published model is added.
    knowledge : Knowledge or None

    Returns
    -------
    dict
        The document `phaseid-predict/1`.

    Raises
    ------
    InputError
        If a text is neither a phase nor a formula, or the density is none.
    """
    if density is not None and not 0.01 <= density <= 30:
        raise InputError(f"A density of {density:g} g/cm3 is none of a solid; give it in g/cm3.")
    knowledge = knowledge or Knowledge.load(state.databases)
    told = replace(state, energy_keV=state.energy_keV or DEFAULT_ENERGY_KEV)
    conditions, _ = settle(told, [], [], knowledge.model)
    if not formulas:
        raise InputError("There is no formula; give at least one, for example Fe3C.")
    phases = [_phase(text, knowledge, density) for text in formulas]
    table = build(phases, conditions, cached=False)
    from phaseid.physics.backscatter import eta_sd

    arguments = (conditions.energy_keV, conditions.tilt_deg)
    chosen = (*arguments, conditions.model, conditions.rule)
    starts = np.searchsorted(table.rows.phase, np.arange(len(phases)))
    compositions = np.add.reduceat(
        table.rows.share[:, None] * table.rows.mass_fractions, starts, axis=0
    )
    # All at once: ten thousand formulas cost little more than one.
    spreads = np.atleast_1d(eta_sd(compositions, *arguments))
    energies = np.atleast_1d(mean_energy_keV(compositions, *chosen))
    by_model = (
        {m.name: eta(compositions, *arguments, m, conditions.rule) for m in knowledge.models()}
        if every_model
        else {}
    )
    found = []
    for i, (text, phase) in enumerate(zip(formulas, phases, strict=True)):
        composition = compositions[i]
        entry = {
            "input": text,
            "name": phase.name,
            "formula": phase.formula,
            "mass_fractions": {
                SYMBOLS[z]: _number(composition[z]) for z in np.flatnonzero(composition > 0)
            },
            "mean_atomic_number": _number(table.mean_atomic_number[i]),
            "mean_atomic_number_min": _number(table.mean_atomic_number_min[i]),
            "mean_atomic_number_max": _number(table.mean_atomic_number_max[i]),
            "eta": _number(table.eta[i]),
            "eta_sd": _number(spreads[i]),
            "signal": _number(table.signal[i]),
            "mean_energy_keV": _number(energies[i]),
            "density": phase.density,
            "range_um": _number(table.range_um[i]),
            "information_depth_um": _number(table.information_depth_um[i]),
            "hazard": phase.hazard,
        }
        if every_model:
            entry["eta_by_model"] = {name: _number(v[i]) for name, v in by_model.items()}
        found.append(entry)
    coat = conditions.coat
    return {
        "schema": SCHEMA,
        "conditions": {
            "energy_keV": conditions.energy_keV,
            "tilt_deg": conditions.tilt_deg,
            "coat": None
            if coat is None
            else {"material": coat.material, "thickness_nm": coat.thickness_nm},
            "detector": {
                "kind": conditions.detector.kind,
                "threshold_keV": conditions.detector.lowest_energy_keV,
            },
            "rule": getattr(conditions.rule, "name", conditions.rule),
        },
        "model": getattr(conditions.model, "name", conditions.model),
        "warnings": [{"code": f.code, "message": f.message} for f in conditions.flags],
        "phases": found,
    }


def _phase(text: str, knowledge: Knowledge, density: float | None) -> Phase:
    position = knowledge.catalogue.index(text)
    phase = (
        given_phase(text, knowledge.catalogue)
        if position is None
        else knowledge.catalogue.phases[position]
    )
    if phase.density_range is None and density is not None:
        phase = replace(phase, density_range=(density, density))
    return phase


def _number(value: float | np.floating[Any] | np.ndarray[Any, Any]) -> float | None:
    number = float(value)
    return float(f"{number:.8g}") if np.isfinite(number) else None
