"""What a hook gives back is checked, so that the plugin is named and not the code that trusts it."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from pathlib import Path
from typing import TYPE_CHECKING, Any, TypeVar

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from phaseid.hooks.specs import ReportSection
    from phaseid.phases.contexts import Coexistence, Context
    from phaseid.physics.elemental import BackscatterModel

T = TypeVar("T")


def paths(found: Any) -> list[Path]:
    """Paths of files."""
    if isinstance(found, str | Path):
        raise TypeError(f"gave the single path {str(found)!r} instead of a list of paths")
    return [Path(p) for p in found]


def contexts(found: Any) -> list[Context]:
    """Contexts."""
    from phaseid.phases.contexts import Context

    return _all_of(found, Context)


def rules(found: Any) -> list[Coexistence]:
    """Coexistence rules."""
    from phaseid.phases.contexts import Coexistence

    return _all_of(found, Coexistence)


def models(found: Any) -> list[BackscatterModel]:
    """Backscatter models; those that ship keep their names."""
    from phaseid.physics.elemental import BackscatterModel
    from phaseid.physics.elemental import models as shipped

    given = _all_of(found, BackscatterModel)
    for model in given:
        if model.name in {s.name for s in shipped()}:
            raise ValueError(f"a model called {model.name!r} ships already; choose another name")
    return given


def sections(found: Any) -> list[ReportSection]:
    """Sections of a report."""
    from phaseid.hooks.specs import ReportSection

    return _all_of(found, ReportSection)


def mask(count: int) -> Callable[[Any], NDArray[np.bool_]]:
    """One truth value per phase."""

    def check(found: Any) -> NDArray[np.bool_]:
        import numpy as np

        given = np.asarray(found)
        if given.shape != (count,) or given.dtype != bool:
            raise ValueError(
                f"gave {given.dtype} of shape {given.shape} instead of bool of shape ({count},)"
            )
        return given

    return check


def factors(count: int) -> Callable[[Any], NDArray[np.float64]]:
    """One factor per phase."""

    def check(found: Any) -> NDArray[np.float64]:
        import numpy as np

        given = np.asarray(found, dtype=np.float64)
        if given.shape != (count,) or not _usable(given):
            raise ValueError(f"gave no {count} finite factors of zero or more, one for each phase")
        return given

    return check


def evidence(clusters: int) -> Callable[[Any], dict[str, NDArray[np.float64]]]:
    """By phase name one factor for all clusters or one for each; every array has shape (clusters,)."""

    def check(found: Any) -> dict[str, NDArray[np.float64]]:
        import numpy as np

        checked = {}
        for name, factor in dict(found).items():
            given = np.asarray(factor, dtype=np.float64)
            if given.shape not in ((), (clusters,)) or not _usable(given):
                raise ValueError(
                    f"gave for {name!r} neither one finite factor of zero or more nor one for each of "
                    f"the {clusters} clusters"
                )
            checked[str(name)] = np.broadcast_to(given, (clusters,))
        return checked

    return check


def _all_of(found: Iterable[Any], kind: type[T]) -> list[T]:
    items = list(found)
    for item in items:
        if not isinstance(item, kind):
            raise TypeError(f"gave a {type(item).__name__} instead of a {kind.__name__}")
    return items


def _usable(given: NDArray[np.float64]) -> bool:
    import numpy as np

    return bool(np.isfinite(given).all() and (given >= 0).all())
