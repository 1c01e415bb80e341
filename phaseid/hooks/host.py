"""Loading plugins and calling their hooks, so that a broken one is named and skipped, never fatal."""

from __future__ import annotations

import importlib
import importlib.util
import os
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import pluggy

from phaseid.hooks.markers import PROJECT

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from phaseid.hooks.specs import ReportSection, Situation
    from phaseid.phases.contexts import Coexistence, Context
    from phaseid.physics.elemental import BackscatterModel

# The plugins that ship, in one place; each is an ordinary plugin.
BUILT_IN = (
    "phaseid_plugins.databases",
    "phaseid_plugins.steel",
    "phaseid_plugins.cast_iron",
    "phaseid_plugins.nickel_cobalt",
    "phaseid_plugins.light_alloys",
    "phaseid_plugins.copper_zinc",
    "phaseid_plugins.refractory_precious",
    "phaseid_plugins.hard_metal",
    "phaseid_plugins.joints_electronics",
    "phaseid_plugins.magnets_batteries",
    "phaseid_plugins.cement_slag_glass",
    "phaseid_plugins.ceramics_coatings",
    "phaseid_plugins.corrosion_dust",
    "phaseid_plugins.preparation",
    "phaseid_plugins.igneous",
    "phaseid_plugins.metamorphic",
    "phaseid_plugins.sedimentary",
    "phaseid_plugins.ore",
    "phaseid_plugins.meteorite",
)


@dataclass(frozen=True)
class Problem:
    """A plugin that failed: its name, when, and one sentence."""

    plugin: str
    moment: str
    message: str


class PluginHost:
    """Typed access to the hooks of all loaded plugins.

    Attributes
    ----------
    problems : list of Problem
        Plugins that failed, in the order it happened; each failing plugin is named once per moment.
    """

    def __init__(self) -> None:
        from phaseid.hooks import specs

        self._manager = pluggy.PluginManager(PROJECT)
        self._manager.add_hookspecs(specs)
        self._origin: dict[str, str] = {}
        self.problems: list[Problem] = []

    # --- loading ---

    def add(self, plugin: object, name: str, origin: str) -> None:
        """Register a plugin object."""
        if name in self._origin:
            self._problem(name, "loading", f"another plugin is called {name!r}; rename one")
            return
        self._origin[name] = origin
        try:
            self._manager.register(plugin, name)
            self._manager.check_pending()
        except Exception as error:
            if self._manager.get_plugin(name) is plugin:
                self._manager.unregister(plugin)
            self._problem(name, "loading", _said(error))

    def add_module(self, module: str, origin: str) -> None:
        """Import a module by name and register it."""
        try:
            self.add(importlib.import_module(module), module, origin)
        except Exception as error:
            self._failed(module, origin, error)

    def add_file(self, path: Path) -> None:
        """Run a plain Python file and register it."""
        name = f"file {path.stem}"
        try:
            spec = importlib.util.spec_from_file_location(f"phaseid_plugin_{path.stem}", path)
            if spec is None or spec.loader is None:
                raise ImportError(f"{path} is no Python file")
            module = importlib.util.module_from_spec(spec)
            spec.loader.exec_module(module)
        except (Exception, SystemExit) as error:
            self._failed(name, str(path), error)
            return
        self.add(module, name, str(path))

    def _failed(self, name: str, origin: str, error: BaseException) -> None:
        self._origin[name] = origin
        self._problem(name, "loading", _said(error))

    def report(self, plugin: str, moment: str, message: str) -> None:
        """Note a fault that was found in what a plugin gave."""
        self._problem(plugin, moment, message)

    def _problem(self, plugin: str, moment: str, message: str) -> None:
        problem = Problem(plugin, moment, message)
        if problem not in self.problems:
            self.problems.append(problem)

    # --- listing ---

    def listing(self) -> list[dict[str, Any]]:
        """Name, origin, hooks and problem of each plugin, in the order of their names."""
        found = []
        for name, origin in sorted(self._origin.items()):
            plugin = self._manager.get_plugin(name)
            callers = self._manager.get_hookcallers(plugin) if plugin is not None else None
            problems = [f"{p.moment}: {p.message}" for p in self.problems if p.plugin == name]
            summary = (getattr(plugin, "__doc__", None) or "").strip().split("\n")[0]
            found.append(
                {
                    "name": name,
                    "origin": origin,
                    "summary": summary,
                    "hooks": sorted(c.name for c in callers or []),
                    "problem": "; ".join(problems) or None,
                }
            )
        return found

    # --- one method per hook ---

    def databases(self) -> list[Path]:
        """All database files, those that ship first."""
        return [Path(p) for found in self._call("register_databases", _paths) for p in found]

    def contexts(self) -> list[Context]:
        """All contexts."""
        return [c for found in self._call("register_contexts", _contexts) for c in found]

    def backscatter_models(self) -> list[BackscatterModel]:
        """All extra models."""
        return [m for found in self._call("register_backscatter_models", list) for m in found]

    def coexistence(self) -> list[Coexistence]:
        """All coexistence rules."""
        return [r for found in self._call("register_coexistence", _rules) for r in found]

    def possible(self, situation: Situation) -> NDArray[np.bool_]:
        """Which phases no plugin excludes."""
        import numpy as np

        count = len(situation.phases)
        possible = np.ones(count, dtype=bool)
        for found in self._call("filter_candidates", _mask(count), situation=situation):
            possible &= found
        return possible

    def factors(self, situation: Situation) -> NDArray[np.float64]:
        """Product of all plugins' factors."""
        import numpy as np

        count = len(situation.phases)
        factors = np.ones(count)
        for found in self._call("weigh_candidates", _factors(count), situation=situation):
            factors *= found
        return factors

    def evidence(self, situation: Situation, image: Mapping[str, Any]) -> dict[str, float]:
        """Product of all plugins' evidence factors, by phase name."""
        factors: dict[str, float] = {}
        found_all = self._call("gather_evidence", _named, situation=situation, image=image)
        for found in found_all:
            for name, factor in found.items():
                factors[name] = factors.get(name, 1.0) * factor
        return factors

    def report_sections(self, document: Mapping[str, Any]) -> list[ReportSection]:
        """All sections plugins add to a report."""
        return [
            s
            for found in self._call("report_sections", _sections, document=document)
            for s in found
        ]

    def _call(self, hook: str, check: Any, **arguments: Any) -> list[Any]:
        """Call every implementation on its own; what one gives is checked before it is used."""
        caller = getattr(self._manager.hook, hook)
        results = []
        for implementation in sorted(caller.get_hookimpls(), key=lambda i: i.plugin_name):
            given = {k: v for k, v in arguments.items() if k in implementation.argnames}
            try:
                found = implementation.function(**given)
                if found is not None:
                    results.append(check(found))
            except Exception as error:
                self._problem(implementation.plugin_name, hook, _said(error))
        return results


def make_host(
    *,
    built_in: Sequence[str] = BUILT_IN,
    entry_points: bool = True,
    folders: Iterable[Path] | None = None,
    blocked: Iterable[str] | None = None,
) -> PluginHost:
    """Load plugins.

    Parameters
    ----------
    built_in : sequence of str
        Modules that ship.
    entry_points : bool
        Whether installed distributions of the entry-point group "phaseid" are loaded.
    folders : iterable of Path, optional
        Folders of plain ``.py`` files; None takes `default_folders`.
    blocked : iterable of str, optional
        Names to leave out; None takes PHASEID_BLOCK (separated by commas).

    Returns
    -------
    PluginHost
    """
    if blocked is None:
        blocked = os.environ.get("PHASEID_BLOCK", "").split(",")
    left_out = {b.strip() for b in blocked}
    host = PluginHost()
    for module in built_in:
        if module not in left_out:
            host.add_module(module, "ships with phaseid")
    if entry_points:
        _add_entry_points(host, left_out)
    for folder in default_folders() if folders is None else folders:
        for path in sorted(Path(folder).glob("*.py")):
            if not path.name.startswith("_") and f"file {path.stem}" not in left_out:
                host.add_file(path)
    return host


def default_folders() -> list[Path]:
    """PHASEID_PLUGINS (separated like a search path) and the user's configuration folder."""
    import platformdirs

    told = [Path(p) for p in os.environ.get("PHASEID_PLUGINS", "").split(os.pathsep) if p]
    return [*told, platformdirs.user_config_path("phaseid") / "plugins"]


def _add_entry_points(host: PluginHost, left_out: set[str]) -> None:
    from importlib.metadata import entry_points

    for point in sorted(entry_points(group=PROJECT), key=lambda p: p.name):
        if point.name in left_out:
            continue
        distribution = point.dist.name if point.dist is not None else "unknown"
        try:
            plugin = point.load()
        except Exception as error:
            host._failed(point.name, f"installed with {distribution}", error)
            continue
        host.add(plugin, point.name, f"installed with {distribution}")


def _said(error: BaseException) -> str:
    text = " ".join(str(error).split()) or "no message"
    return f"{type(error).__name__}: {text[:300]}"


# --- what a hook gives back is checked, so that the plugin is named and not the code that trusts it ---


def _paths(found: Any) -> list[Path]:
    return [Path(p) for p in found]


def _contexts(found: Any) -> list[Any]:
    from phaseid.phases.contexts import Context

    return [_typed(item, Context) for item in found]


def _rules(found: Any) -> list[Any]:
    from phaseid.phases.contexts import Coexistence

    return [_typed(item, Coexistence) for item in found]


def _sections(found: Any) -> list[Any]:
    from phaseid.hooks.specs import ReportSection

    return [_typed(item, ReportSection) for item in found]


def _typed(item: Any, kind: type[Any]) -> Any:
    if not isinstance(item, kind):
        raise TypeError(f"gave a {type(item).__name__} instead of a {kind.__name__}")
    return item


def _mask(count: int) -> Any:
    def check(found: Any) -> Any:
        import numpy as np

        mask = np.asarray(found)
        if mask.shape != (count,) or mask.dtype != bool:
            raise ValueError(
                f"gave {mask.dtype} of shape {mask.shape} instead of bool of ({count},)"
            )
        return mask

    return check


def _factors(count: int) -> Any:
    def check(found: Any) -> Any:
        import numpy as np

        factors = np.asarray(found, dtype=float)
        if factors.shape != (count,) or not np.isfinite(factors).all() or (factors < 0).any():
            raise ValueError(f"gave no {count} finite factors of zero or more")
        return factors

    return check


def _named(found: Any) -> dict[str, float]:
    factors = {str(name): float(factor) for name, factor in dict(found).items()}
    if any(not 0 <= f < float("inf") for f in factors.values()):
        raise ValueError("gave a factor that is not finite and zero or more")
    return factors
