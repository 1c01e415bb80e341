"""Hooks: how others add to phaseid."""
