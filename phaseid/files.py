"""Writing files so that a reader never sees half of one."""

from __future__ import annotations

import contextlib
import os
import tempfile
from collections.abc import Iterator
from pathlib import Path

from phaseid.errors import InputError


@contextlib.contextmanager
def replacing(path: Path | str) -> Iterator[Path]:
    """Give a temporary path beside `path` and move it there when the block ends well.

    Parameters
    ----------
    path : Path or str
        The file to write or replace.

    Yields
    ------
    Path
        An existing, empty file in the same folder and with the same suffix.

    Raises
    ------
    InputError
        If the folder cannot be written.
    """
    path = Path(path)
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        handle, name = tempfile.mkstemp(
            prefix=f".{path.stem}-", suffix=path.suffix, dir=path.parent
        )
        os.close(handle)
    except OSError as error:
        raise InputError(
            f"Cannot write {path}: {error.strerror or error}; choose a folder you may write to."
        ) from None
    temporary = Path(name)
    try:
        yield temporary
        # mkstemp makes the file private; give it the permissions any other new file would get.
        umask = os.umask(0)
        os.umask(umask)
        temporary.chmod(0o666 & ~umask)
        temporary.replace(path)
    finally:
        temporary.unlink(missing_ok=True)


def write_bytes(path: Path | str, content: bytes) -> None:
    """Write `content` to `path` in one step that cannot leave half a file."""
    with replacing(path) as temporary, temporary.open("wb") as stream:
        stream.write(content)
        stream.flush()
        # A session must survive a kill and, as far as the disk allows, a power cut.
        os.fsync(stream.fileno())


def write_text(path: Path | str, content: str) -> None:
    """Write `content` to `path` as UTF-8 in one step that cannot leave half a file."""
    write_bytes(path, content.encode("utf-8"))
