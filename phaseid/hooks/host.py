"""Loading plugins and calling their hooks, so that a broken one is named and skipped, never fatal."""

from __future__ import annotations

import importlib
import importlib.util
import os
import sys
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any, TypeVar

import pluggy

from phaseid.hooks import checked
from phaseid.hooks.markers import PROJECT

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from phaseid.hooks.specs import ReportSection, Situation
    from phaseid.phases.contexts import Coexistence, Context
    from phaseid.physics.elemental import BackscatterModel

T = TypeVar("T")

# What a plugin can do wrong; leaving the program is not a plugin's to decide.
FAILURES = (Exception, SystemExit)

SHIPS = "ships with phaseid"
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
            self._problem(
                name,
                "loading",
                f"a second plugin of this name, from {origin}, is left out; rename it",
            )
            return
        self._origin[name] = origin
        try:
            self._manager.register(plugin, name)
            # A misspelt hook would pass silently.
            self._manager.check_pending()
            self._refuse_wrappers(plugin)
        except FAILURES as error:
            if self._manager.get_plugin(name) is plugin:
                self._manager.unregister(plugin)
            self._problem(name, "loading", _said(error))

    def _refuse_wrappers(self, plugin: object) -> None:
        for caller in self._manager.get_hookcallers(plugin) or ():
            for one in caller.get_hookimpls():
                if one.plugin is plugin and (one.wrapper or one.hookwrapper):
                    raise TypeError(
                        f"{caller.name} is a wrapper; give a plain function, each is called on its own"
                    )

    def add_module(self, module: str, origin: str) -> None:
        """Import a module by name and register it."""
        try:
            plugin = importlib.import_module(module)
        except FAILURES as error:
            self.failed(module, origin, error)
            return
        self.add(plugin, module, origin)

    def add_file(self, path: Path) -> None:
        """Run a plain Python file and register it."""
        name = f"file {path.stem}"
        if name in self._origin:
            self.add(None, name, str(path))
            return
        module_name = f"phaseid_plugin_file_{path.stem}"
        try:
            spec = importlib.util.spec_from_file_location(module_name, path)
            if spec is None or spec.loader is None:
                raise ImportError(f"{path} is no Python file")
            module = importlib.util.module_from_spec(spec)
            # Dataclasses look their module up while it runs.
            sys.modules[module_name] = module
            spec.loader.exec_module(module)
        except FAILURES as error:
            sys.modules.pop(module_name, None)
            self.failed(name, str(path), error)
            return
        self.add(module, name, str(path))

    def failed(self, name: str, origin: str, error: BaseException) -> None:
        """Note a plugin that could not be loaded."""
        self._origin.setdefault(name, origin)
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
        for name in sorted({*self._origin, *(p.plugin for p in self.problems)}):
            plugin = self._manager.get_plugin(name)
            callers = self._manager.get_hookcallers(plugin) if plugin is not None else None
            problems = [f"{p.moment}: {p.message}" for p in self.problems if p.plugin == name]
            summary = (getattr(plugin, "__doc__", None) or "").strip().split("\n")[0]
            found.append(
                {
                    "name": name,
                    "origin": self._origin.get(name, ""),
                    "summary": summary,
                    "hooks": sorted(c.name for c in callers or []),
                    "problem": "; ".join(problems) or None,
                }
            )
        return found

    # --- one method per hook ---

    def databases(self) -> list[Path]:
        """All database files, those that ship first."""
        return [path for _, path in self.databases_by_plugin()]

    def databases_by_plugin(self) -> list[tuple[str, Path]]:
        """Names of plugins with each database file they add, those that ship first."""
        called = self._call("register_databases", checked.paths)
        return [(name, path) for name, found in called for path in found]

    def contexts(self) -> list[Context]:
        """All contexts."""
        return self._gather("register_contexts", checked.contexts)

    def backscatter_models(self) -> list[BackscatterModel]:
        """All extra models."""
        return self._gather("register_backscatter_models", checked.models)

    def coexistence(self) -> list[Coexistence]:
        """All coexistence rules."""
        return self._gather("register_coexistence", checked.rules)

    def possible(self, situation: Situation) -> NDArray[np.bool_]:
        """Which phases no plugin excludes, shape (P,)."""
        import numpy as np

        count = len(situation.phases)
        possible = np.ones(count, dtype=bool)
        for _, found in self._call("filter_candidates", checked.mask(count), situation=situation):
            possible &= found
        return possible

    def factors(self, situation: Situation) -> NDArray[np.float64]:
        """Product of all plugins' factors, shape (P,)."""
        import numpy as np

        count = len(situation.phases)
        factors = np.ones(count)
        for _, found in self._call("weigh_candidates", checked.factors(count), situation=situation):
            factors *= found
        return factors

    def evidence(
        self, situation: Situation, image: Mapping[str, Any]
    ) -> dict[str, NDArray[np.float64]]:
        """Product of all plugins' evidence factors by phase name, one for each cluster."""
        check = checked.evidence(len(situation.clusters))
        factors: dict[str, NDArray[np.float64]] = {}
        for _, found in self._call("gather_evidence", check, situation=situation, image=image):
            for name, factor in found.items():
                factors[name] = factors.get(name, 1.0) * factor
        return factors

    def report_sections(self, document: Mapping[str, Any]) -> list[ReportSection]:
        """All sections plugins add to a report."""
        return self._gather("report_sections", checked.sections, document=document)

    def _gather(self, hook: str, check: Callable[[Any], list[T]], **arguments: Any) -> list[T]:
        return [item for _, found in self._call(hook, check, **arguments) for item in found]

    def _call(self, hook: str, check: Callable[[Any], T], **arguments: Any) -> list[tuple[str, T]]:
        """Call every implementation on its own; what one gives is checked before it is used."""
        results = []
        implementations = getattr(self._manager.hook, hook).get_hookimpls()
        # Those that ship first, then by name: the order of loading must not matter.
        for one in sorted(
            implementations, key=lambda i: (self._origin[i.plugin_name] != SHIPS, i.plugin_name)
        ):
            given = {name: arguments[name] for name in one.argnames}
            try:
                found = one.function(**given)
                if found is not None:
                    results.append((one.plugin_name, check(found)))
            except FAILURES as error:
                self._problem(one.plugin_name, hook, _said(error))
        return results


def make_host(
    *,
    built_in: Sequence[str] = BUILT_IN,
    entry_points: bool = True,
    folders: Iterable[Path] | None = None,
    extra: Mapping[str, object] | None = None,
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
        Folders of plain ``.py`` files, or such files; None takes `default_folders`.
    extra : mapping of str to object, optional
        Plugin objects or modules at hand, by name.
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
            host.add_module(module, SHIPS)
    for name, plugin in (extra or {}).items():
        if name not in left_out:
            host.add(plugin, name, "given by the caller")
    if entry_points:
        _add_entry_points(host, left_out)
    for folder in default_folders() if folders is None else folders:
        _add_folder(host, Path(folder), left_out)
    return host


def default_folders() -> list[Path]:
    """PHASEID_PLUGINS (separated like a search path) and the user's configuration folder, if it is there."""
    import platformdirs

    told = [Path(p) for p in os.environ.get("PHASEID_PLUGINS", "").split(os.pathsep) if p]
    own = platformdirs.user_config_path("phaseid") / "plugins"
    return [*told, own] if own.is_dir() else told


def _add_folder(host: PluginHost, folder: Path, left_out: set[str]) -> None:
    if not folder.exists():
        host.report(str(folder), "loading", "there is no such plugin folder; mend PHASEID_PLUGINS")
        return
    try:
        files = sorted(folder.glob("*.py")) if folder.is_dir() else [folder]
    except OSError as error:
        host.report(str(folder), "loading", _said(error))
        return
    for path in files:
        if not path.name.startswith("_") and f"file {path.stem}" not in left_out:
            host.add_file(path)


def _add_entry_points(host: PluginHost, left_out: set[str]) -> None:
    from importlib.metadata import entry_points

    for point in sorted(entry_points(group=PROJECT), key=lambda p: p.name):
        if point.name in left_out:
            continue
        distribution = point.dist.name if point.dist is not None else "unknown"
        try:
            plugin = point.load()
        except FAILURES as error:
            host.failed(point.name, f"installed with {distribution}", error)
            continue
        host.add(plugin, point.name, f"installed with {distribution}")


def _said(error: BaseException) -> str:
    text = " ".join(str(error).split()) or "no message"
    return f"{type(error).__name__}: {text[:300]}"
