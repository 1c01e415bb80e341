"""Magnets and batteries."""

from __future__ import annotations

from collections.abc import Sequence

from phaseid.hooks import hookimpl
from phaseid.phases.contexts import Context

CONTEXTS = (
    Context("magnet", "Magnet", "Permanent and soft magnets."),
    Context(
        "magnet/rare-earth",
        "Rare-earth magnet",
        "Nd-Fe-B and Sm-Co with rare-earth-rich grain boundaries.",
    ),
    Context("magnet/ferrite", "Ferrite magnet", "Barium, strontium and spinel ferrites."),
    Context("battery", "Battery", "Electrodes, current collectors, solid electrolytes."),
    Context(
        "battery/lithium-ion",
        "Lithium-ion battery",
        "Layered oxides, phosphates, graphite, silicon.",
    ),
    Context("battery/lead-acid", "Lead-acid battery", "Lead grids, lead oxides and sulphate."),
)


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS
