"""The markers plugin authors and the specifications use; importing them loads nothing else."""

from __future__ import annotations

import pluggy

PROJECT = "phaseid"

hookspec = pluggy.HookspecMarker(PROJECT)
hookimpl = pluggy.HookimplMarker(PROJECT)
