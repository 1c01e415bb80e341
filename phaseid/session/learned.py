"""What this laboratory has accepted so far, kept in one SQLite file, and what follows for a context.

A phase accepted n times out of N in a context gets the weight of a Dirichlet count: the context's own
weights count as `STRENGTH` earlier identifications, and every accepted one adds one. The counts can be
shown and cleared; they are used only where the user has switched them on.
"""

from __future__ import annotations

import contextlib
import sqlite3
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from phaseid.errors import InputError

Floats = NDArray[np.float64]

# How many accepted identifications the shipped weights of a context are worth. Common practice.
STRENGTH = 30.0
# Stands for "no context" in the file.
ANYWHERE = ""

_SCHEMA = """
CREATE TABLE IF NOT EXISTS accepted (
    context TEXT NOT NULL,
    phase TEXT NOT NULL,
    image_sha256 TEXT NOT NULL,
    grey REAL NOT NULL,
    note TEXT NOT NULL DEFAULT '',
    made TEXT NOT NULL DEFAULT CURRENT_TIMESTAMP,
    PRIMARY KEY (context, image_sha256, grey)
);
"""


@dataclass(frozen=True)
class Count:
    """How often a phase was accepted in a context."""

    context: str
    phase: str
    count: int


def default_path() -> Path:
    """Where the file is kept unless PHASEID_LEARNED says otherwise."""
    import os

    import platformdirs

    told = os.environ.get("PHASEID_LEARNED")
    return Path(told) if told else platformdirs.user_data_path("phaseid") / "learned.sqlite"


class Learned:
    """The file of accepted identifications; safe for several processes.

    Parameters
    ----------
    path : Path or None
        None takes `default_path`.
    """

    def __init__(self, path: Path | None = None) -> None:
        self.path = path or default_path()

    @contextlib.contextmanager
    def _open(self) -> Iterator[sqlite3.Connection]:
        try:
            self.path.parent.mkdir(parents=True, exist_ok=True)
            # Another process may hold the lock for the moment of a write.
            connection = sqlite3.connect(self.path, timeout=20.0)
            try:
                connection.execute(_SCHEMA)
                with connection:
                    yield connection
            finally:
                connection.close()
        except (OSError, sqlite3.Error) as error:
            raise InputError(
                f"The file of accepted identifications {self.path} cannot be used ({error}); move it "
                "away, or set PHASEID_LEARNED to another path."
            ) from None

    def accept(
        self, contexts: Sequence[str], phase: str, image_sha256: str, grey: float, note: str = ""
    ) -> None:
        """Enter an accepted identification; a second one of the same cluster replaces the first."""
        with self._open() as connection:
            connection.executemany(
                "INSERT OR REPLACE INTO accepted (context, phase, image_sha256, grey, note) "
                "VALUES (?, ?, ?, ?, ?)",
                [
                    (context, phase, image_sha256, round(grey, 3), note)
                    for context in contexts or [ANYWHERE]
                ],
            )

    def withdraw(self, image_sha256: str, grey: float) -> None:
        """Take an identification back."""
        with self._open() as connection:
            connection.execute(
                "DELETE FROM accepted WHERE image_sha256 = ? AND grey = ?",
                (image_sha256, round(grey, 3)),
            )

    def counts(self, contexts: Sequence[str] | None = None) -> list[Count]:
        """Counts per context and phase, of all contexts or of the given ones."""
        if contexts is None and not self.path.exists():
            return []
        with self._open() as connection:
            rows = connection.execute(
                "SELECT context, phase, COUNT(*) FROM accepted GROUP BY context, phase "
                "ORDER BY context, COUNT(*) DESC, phase"
            ).fetchall()
        wanted = None if contexts is None else set(contexts or [ANYWHERE])
        return [Count(c, p, n) for c, p, n in rows if wanted is None or c in wanted]

    def clear(self, context: str | None = None) -> int:
        """Forget one context, or everything; gives the number of identifications forgotten."""
        with self._open() as connection:
            if context is None:
                return connection.execute("DELETE FROM accepted").rowcount
            return connection.execute("DELETE FROM accepted WHERE context = ?", (context,)).rowcount


def learned_weights(weights: Floats, index: Mapping[str, int], counts: Sequence[Count]) -> Floats:
    """Mean of the Dirichlet posterior of a context's weights.

    Parameters
    ----------
    weights : ndarray of shape (P,)
        The context's own weights, any scale.
    index : mapping of str to int
        Phase names to positions; names that are gone are passed over.
    counts : sequence of Count

    Returns
    -------
    ndarray of shape (P,)
        On the scale of `weights`: unchanged where nothing was counted.

    References
    ----------
    Gelman et al. 2013, Bayesian Data Analysis, section 3.4.
    """
    total = float(weights.sum())
    seen = np.zeros_like(weights)
    for count in counts:
        if count.phase in index:
            seen[index[count.phase]] += count.count
    posterior = (STRENGTH * weights / total + seen) / (STRENGTH + seen.sum())
    return np.asarray(posterior * total)
