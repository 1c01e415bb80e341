"""The one kind of failure a user is meant to read."""

from __future__ import annotations


class PhaseidError(Exception):
    """Base of every error this package raises on purpose."""


class InputError(PhaseidError, ValueError):
    """Something the user gave cannot be used.

    Parameters
    ----------
    message : str
        One sentence: what is wrong, where, and what to do about it.
    """
