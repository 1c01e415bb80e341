"""Compositions of all phases of a catalogue, worked out once and kept on disk."""

from __future__ import annotations

import hashlib
import io
import os
import zipfile
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

import phaseid
from phaseid.errors import InputError
from phaseid.files import write_bytes
from phaseid.phases.records import Phase

Floats = NDArray[np.float64]

# Compositions a variable phase is represented by.
VARIANTS = 9
# Raised when the formula code changes what comes out of it.
_VERSION = 3


@dataclass(frozen=True)
class Compositions:
    """Rows of composition, several per phase of variable composition.

    Attributes
    ----------
    phase : ndarray of int, shape (R,)
        Phase of each row.
    share : ndarray of shape (R,)
        Weight of each row within its phase.
    mass_fractions : ndarray of shape (R, 103)
    corner_phase : ndarray of int, shape (C,)
    corner_mass_fractions : ndarray of shape (C, 103)
        Compositions at the ends of the ranges.
    """

    phase: NDArray[np.int32]
    share: Floats
    mass_fractions: Floats
    corner_phase: NDArray[np.int32]
    corner_mass_fractions: Floats


def work_out(phases: Sequence[Phase]) -> Compositions:
    """Work out all compositions.

    Raises
    ------
    InputError
        If a formula cannot be read.
    """
    rows: list[Floats] = []
    shares: list[Floats] = []
    owner: list[int] = []
    corners: list[Floats] = []
    corner_owner: list[int] = []
    for p, phase in enumerate(phases):
        found, weights = phase.parsed.variants(VARIANTS)
        rows.append(found)
        shares.append(weights)
        owner += [p] * len(found)
        ends = phase.parsed.extremes() if phase.parsed.is_variable else found
        corners.append(ends)
        corner_owner += [p] * len(ends)
    empty = np.zeros((0, 103))
    return Compositions(
        np.array(owner, dtype=np.int32),
        np.concatenate([*shares, np.zeros(0)]),
        np.concatenate([*rows, empty]),
        np.array(corner_owner, dtype=np.int32),
        np.concatenate([*corners, empty]),
    )


def compositions(phases: Sequence[Phase]) -> Compositions:
    """As `work_out`, kept on disk by content and version.

    A cache that cannot be read is made anew; one that cannot be written is done without. Files are
    written in one step, so two processes that start together cannot harm each other.
    """
    path = cache_folder() / f"compositions-{_key(phases)}.npz"
    try:
        with np.load(path, allow_pickle=False) as stored:
            return Compositions(*(stored[name] for name in Compositions.__dataclass_fields__))
    except (OSError, ValueError, KeyError, zipfile.BadZipFile, EOFError):
        made = work_out(phases)
    stream = io.BytesIO()
    np.savez_compressed(stream, **{n: getattr(made, n) for n in Compositions.__dataclass_fields__})
    try:
        write_bytes(path, stream.getvalue())
        _tidy(path.parent)
    except (InputError, OSError):
        pass
    return made


def cache_folder() -> Path:
    """Where derived values are kept: PHASEID_CACHE, or the user's cache folder."""
    told = os.environ.get("PHASEID_CACHE")
    if told:
        return Path(told)
    import platformdirs

    return platformdirs.user_cache_path("phaseid")


def _key(phases: Sequence[Phase]) -> str:
    digest = hashlib.sha256(f"{phaseid.__version__}/{_VERSION}/{VARIANTS}".encode())
    for phase in phases:
        digest.update(repr((phase.formula, sorted(phase.ranges.items()))).encode())
    return digest.hexdigest()[:32]


def _tidy(folder: Path, most: int = 12) -> None:
    files = sorted(folder.glob("compositions-*.npz"), key=lambda f: f.stat().st_mtime)
    for old in files[:-most]:
        old.unlink(missing_ok=True)
