"""Hard metals and cermets."""

from __future__ import annotations

from collections.abc import Sequence

from phaseid.hooks import hookimpl
from phaseid.phases.contexts import Coexistence, Context

CONTEXTS = (
    Context("hard-metal", "Hard metal", "Carbides in a metallic binder."),
    Context(
        "hard-metal/wc-co",
        "WC-Co hard metal",
        "Tungsten carbide with cobalt; eta phase when carbon is short, graphite when it is in excess.",
    ),
    Context("hard-metal/cermet", "Cermet", "Titanium carbonitride with nickel or cobalt."),
)

COEXISTENCE = (
    Coexistence(
        ("Eta carbide M6C (hard metal)", "Eta carbide M12C (hard metal)", "Ditungsten carbide"),
        ("Graphite",),
        0.05,
        "Eta carbide and W2C mean too little carbon, graphite too much (phase diagram C-Co-W; common "
        "practice in hard-metal control).",
        ("hard-metal",),
    ),
)


@hookimpl
def register_contexts() -> Sequence[Context]:
    return CONTEXTS


@hookimpl
def register_coexistence() -> Sequence[Coexistence]:
    return COEXISTENCE
