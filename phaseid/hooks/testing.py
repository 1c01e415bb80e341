"""For plugin authors' own tests: a host with one plugin, a situation, and a check of everything."""

from __future__ import annotations

import inspect
from collections.abc import Callable, Iterable, Mapping, Sequence
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import numpy as np

from phaseid.hooks import hookimpl
from phaseid.hooks.host import PluginHost, make_host
from phaseid.hooks.specs import ClusterSummary, Situation
from phaseid.phases.contexts import Coexistence
from phaseid.phases.records import Phase
from phaseid.phases.table import build
from phaseid.physics.conditions import Conditions
from phaseid.physics.elemental import BackscatterModel

FORMULAS = ("Fe", "FeS", "Fe3O4", "Al2O3", "SiO2", "CaCO3", "C")


def plugin_of(**hooks: Callable[..., Any]) -> SimpleNamespace:
    """A plugin made of functions named after hooks."""
    return SimpleNamespace(**{name: hookimpl(function) for name, function in hooks.items()})


def host_of(*plugins: object) -> PluginHost:
    """A host with the given plugins and nothing else: no built-in ones, none of this machine.

    Parameters
    ----------
    *plugins : module, object or Path
        Modules, plugin objects, or paths of ``.py`` files. They are called "plugin 0", "plugin 1" and so
        on; a file goes by its own name.
    """
    files = [p for p in plugins if isinstance(p, Path)]
    objects = {f"plugin {n}": p for n, p in enumerate(plugins) if not isinstance(p, Path)}
    return make_host(built_in=(), entry_points=False, folders=files, extra=objects, blocked=())


def situation_of(
    phases: Iterable[Phase | str] = FORMULAS,
    contexts: Sequence[str] = (),
    conditions: Conditions | None = None,
    clusters: Sequence[ClusterSummary] = (),
) -> Situation:
    """A situation as hooks see it.

    Parameters
    ----------
    phases : iterable of Phase or str
        A string is a formula, and the phase is called by it.
    contexts : sequence of str
        Full paths.
    conditions : Conditions, optional
        20 keV, no tilt and no coat if not given.
    clusters : sequence of ClusterSummary

    Raises
    ------
    InputError
        For a formula that cannot be read.
    """
    made = [p if isinstance(p, Phase) else Phase(p, p, "given by a test") for p in phases]
    settled = conditions or Conditions()
    table = build(made, settled, cached=False)
    return Situation(
        settled,
        tuple(contexts),
        tuple(made),
        table.mean_atomic_number,
        table.eta,
        table.signal,
        tuple(clusters),
    )


def faults(
    plugin: object,
    situation: Situation | None = None,
    document: Mapping[str, Any] | None = None,
) -> list[str]:
    """Call every hook a plugin has; what is wrong, one sentence each, empty if nothing is.

    Parameters
    ----------
    plugin : module, object or Path
    situation : Situation, optional
        A handful of phases without a context, and one cluster, if not given.
    document : mapping, optional
        Candidates document for `report_sections`; an empty one if not given.
    """
    given = situation or situation_of(clusters=[ClusterSummary(100.0, 0.1, 3.0, 1.0, 1000, 10)])
    host = host_of(plugin)
    image = {"path": "scene.tif", "sha256": "", "energy_keV": 20.0, "tilt_deg": 0.0}
    host.databases()
    host.contexts()
    host.coexistence()
    host.possible(given)
    host.factors(given)
    host.evidence(given, image)
    host.report_sections(document or {})
    models = [(m.name, _wrong_with(m)) for m in host.backscatter_models()]
    found = [f"{p.moment}: {p.message}" for p in host.problems]
    found += [f"the model {name}: {wrong}" for name, wrong in models if wrong]
    if not any(entry["hooks"] for entry in host.listing()) and not found:
        found.append("loading: there is no function marked @hookimpl")
    return found


def unknown_names(rules: Iterable[Coexistence], known: Callable[[str], object]) -> list[str]:
    """Names in coexistence rules that no database has; a rule passes over them without a word.

    Parameters
    ----------
    rules : iterable of Coexistence
    known : callable
        Gives None for an unknown name; `Catalogue.index` does.
    """
    names = {name for rule in rules for name in (*rule.first, *rule.second)}
    return sorted(name for name in names if known(name) is None)


def hook_names() -> tuple[str, ...]:
    """Names of all hooks, in the order in which they are specified."""
    from phaseid.hooks import specs

    return tuple(
        name
        for name, function in vars(specs).items()
        if inspect.isfunction(function) and hasattr(function, "phaseid_spec")
    )


def _wrong_with(model: BackscatterModel) -> str | None:
    low, high = model.z_range
    numbers = np.arange(np.ceil(low), np.floor(high) + 1)
    energy = 20.0 if model.energy_range_keV is None else float(np.mean(model.energy_range_keV))
    try:
        eta = np.asarray(model.elemental(numbers, energy), dtype=np.float64)
    except Exception as error:
        return f"fails with {type(error).__name__}: {error}"
    if eta.shape != numbers.shape:
        return f"gives shape {eta.shape} for {numbers.shape} atomic numbers"
    if not ((eta >= 0) & (eta < 1)).all():
        worst = int(numbers[int(np.argmax(np.abs(eta - 0.5)))])
        return f"gives an eta outside 0 to 1, at atomic number {worst} for example"
    return None
