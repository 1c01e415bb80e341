"""Phases: what the candidates are."""
