"""What an image says about itself that the analyst must know before trusting its greys."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

Severity = Literal["note", "caution", "serious"]


@dataclass(frozen=True)
class Finding:
    """One property of an image that limits what its greys can tell.

    Attributes
    ----------
    code : str
        Stable short name, for filtering and tests.
    message : str
        One sentence: what was found, how much, and what it forbids.
    remedy : str
        One sentence: what to do about it.
    severity : {"note", "caution", "serious"}
        "serious" means that results drawn from it are likely wrong.
    """

    code: str
    message: str
    remedy: str = ""
    severity: Severity = "caution"
