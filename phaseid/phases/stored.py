"""Arrays kept on disk between runs, keyed by what they were made from.

A file that cannot be read is made anew; one that cannot be written is done without. Files are written in
one step, so two processes that start together cannot harm each other.
"""

from __future__ import annotations

import hashlib
import io
import os
import zipfile
from collections.abc import Callable
from functools import lru_cache
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

import phaseid
from phaseid.errors import InputError
from phaseid.files import write_bytes

Arrays = dict[str, NDArray[np.generic]]

# Files kept of each kind; the oldest go first.
_MOST = 24


def cache_folder() -> Path:
    """Where derived values are kept: PHASEID_CACHE, or the user's cache folder."""
    told = os.environ.get("PHASEID_CACHE")
    if told:
        return Path(told)
    import platformdirs

    return platformdirs.user_cache_path("phaseid")


def key_of(*parts: str) -> str:
    """Key of content: the parts, this version, and the state of the code that makes the values."""
    text = "\0".join((phaseid.__version__, _code(), *parts))
    return hashlib.sha256(text.encode()).hexdigest()[:32]


def stored(kind: str, key: str, make: Callable[[], Arrays]) -> Arrays:
    """Arrays of a kind and key from the disk, or made and put there.

    Parameters
    ----------
    kind : str
        Beginning of the file's name.
    key : str
        As from `key_of`.
    make : callable
        Makes the arrays by name.

    Returns
    -------
    dict of str to ndarray
    """
    path = cache_folder() / f"{kind}-{key}.npz"
    try:
        # From bytes, as a damaged file would be left open.
        with np.load(io.BytesIO(path.read_bytes()), allow_pickle=False) as found:
            return _full({name: found[name] for name in found.files})
    except (OSError, ValueError, KeyError, IndexError, TypeError, zipfile.BadZipFile, EOFError):
        made = make()
    stream = io.BytesIO()
    np.savez(stream, **_sparse(made))  # type: ignore[arg-type]
    try:
        write_bytes(path, stream.getvalue())
        _tidy(path.parent, kind)
    except (InputError, OSError):
        pass
    return made


def _sparse(arrays: Arrays) -> Arrays:
    """Tables of composition are mostly zeros: only the others are written."""
    kept: Arrays = {}
    for name, array in arrays.items():
        if array.ndim != 2:
            kept[name] = array
            continue
        at = np.flatnonzero(array)
        kept[f"{name}.at"] = at.astype(np.int32)
        kept[f"{name}.value"] = array.ravel()[at]
        kept[f"{name}.shape"] = np.array(array.shape)
    return kept


def _full(kept: Arrays) -> Arrays:
    arrays = {name: array for name, array in kept.items() if "." not in name}
    for name in {n.rsplit(".", 1)[0] for n in kept if "." in n}:
        value = kept[f"{name}.value"]
        rows, columns = (int(n) for n in kept[f"{name}.shape"])
        whole = np.zeros(rows * columns, dtype=value.dtype)
        whole[kept[f"{name}.at"].astype(np.int64)] = value
        arrays[name] = whole.reshape(rows, columns)
    return arrays


@lru_cache(maxsize=1)
def _code() -> str:
    """Names, sizes and times of the files that values are made by, so that none outlives a change."""
    root = Path(phaseid.__file__).parent
    digest = hashlib.sha256()
    for package in ("physics", "physics/tables", "phases"):
        for path in sorted((root / package).iterdir()):
            if path.suffix in (".py", ".json", ".npz"):
                state = path.stat()
                digest.update(f"{path.name} {state.st_size} {state.st_mtime_ns}\n".encode())
    return digest.hexdigest()


def _tidy(folder: Path, kind: str) -> None:
    files = sorted(folder.glob(f"{kind}-*.npz"), key=lambda f: f.stat().st_mtime)
    for old in files[:-_MOST]:
        old.unlink(missing_ok=True)
