"""How others add to phaseid: ``from phaseid.hooks import hookimpl``."""

from phaseid.hooks.markers import hookimpl

__all__ = ["hookimpl"]
