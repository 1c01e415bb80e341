"""Reading one page of a TIFF file."""

from __future__ import annotations

import logging
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from phaseid.errors import InputError
from phaseid.image.notices import Finding

SIGNATURES = (b"II*\x00", b"MM\x00*", b"II+\x00", b"MM\x00+")
# Metadata dialects that the general-purpose reader already parses.
PARSED = (
    "fei_metadata",
    "sem_metadata",
    "sis_metadata",
    "tvips_metadata",
    "imagej_metadata",
    "gatan_metadata",
    "epics_metadata",
    "metaseries_metadata",
    "fluoview_metadata",
    "stk_metadata",
    "ome_metadata",
)
PIXEL_TAGS = range(256, 280)


@dataclass
class RawPage:
    """Pixels as stored, with whatever the file says about them."""

    data: NDArray[Any]
    palette: NDArray[Any] | None
    bits: int
    page: int
    pages: int
    reader: str
    metadata: Mapping[str, Any]
    flags: Sequence[Finding] = field(default_factory=list)


def is_tiff(path: Path) -> bool:
    """Whether a file starts like a TIFF, whatever its name."""
    with path.open("rb") as stream:
        return stream.read(4) in SIGNATURES


def read_tiff(path: Path, page: int | None) -> RawPage:
    """Read one page.

    Parameters
    ----------
    path : Path
    page : int or None
        None takes the largest page.

    Returns
    -------
    RawPage

    Raises
    ------
    InputError
        If the file is damaged or the page does not exist.
    """
    import tifffile

    flags: list[Finding] = []
    try:
        with _quiet(), tifffile.TiffFile(path) as file:
            index = _choose(file, path, page, flags)
            chosen = file.pages[index]
            assert isinstance(chosen, tifffile.TiffPage)
            _whole(chosen, path)
            data = chosen.asarray()
            palette = None
            if chosen.colormap is not None:
                palette = (np.asarray(chosen.colormap).T // 257).astype(np.uint8)
            data = _two_dimensional(data, chosen)
            if chosen.photometric == tifffile.PHOTOMETRIC.MINISWHITE and data.dtype.kind == "u":
                data = np.iinfo(data.dtype).max - data
            metadata = _metadata(file, chosen)
            bits = int(np.max(chosen.bitspersample))
            pages = len(file.pages)
    except InputError:
        raise
    except Exception as error:
        # The reader raises many kinds for damaged files (struct, codec, key and value errors).
        raise InputError(
            f"{path} is a damaged or cut-off TIFF, or uses a compression that cannot be read "
            f"({_short(error)}); copy it again or export it anew."
        ) from None
    return RawPage(data, palette, bits, index, pages, "tifffile", metadata, flags)


def _choose(file: Any, path: Path, page: int | None, flags: list[Finding]) -> int:
    pages = len(file.pages)
    if pages == 0:
        raise InputError(f"{path} is a TIFF without any page; export it anew.")
    if page is not None:
        if not 0 <= page < pages:
            raise InputError(
                f"{path} has {pages} page(s), numbered from 0; page {page} does not exist."
            )
        return page
    if pages == 1:
        return 0
    sizes = [int(p.imagewidth) * int(p.imagelength) for p in file.pages]
    index = int(np.argmax(sizes))
    same = sizes.count(sizes[index])
    smaller = "" if same == pages else " (the others are smaller)"
    flags.append(
        Finding(
            "several-pages",
            f"{path.name} holds {pages} pages; page {index} is used{smaller}.",
            "Choose another page if this is not the backscattered-electron image.",
            "caution" if same > 1 else "note",
        )
    )
    return index


def _whole(page: Any, path: Path) -> None:
    size = path.stat().st_size
    ends = [o + n for o, n in zip(page.dataoffsets, page.databytecounts, strict=False)]
    if ends and max(ends) > size:
        raise InputError(
            f"{path} is cut short: its pixels end at byte {max(ends)} but the file has {size} bytes; "
            "copy it again from its source."
        )


def _two_dimensional(data: NDArray[Any], page: Any) -> NDArray[Any]:
    """Bring channels last and drop axes of length one."""
    while data.ndim > 2 and data.shape[0] == 1:
        data = data[0]
    if data.ndim == 3 and data.shape[-1] not in (2, 3, 4) and data.shape[0] in (2, 3, 4):
        data = np.moveaxis(data, 0, -1)
    return data


def _metadata(file: Any, page: Any) -> dict[str, Any]:
    found: dict[str, Any] = {}
    for name in PARSED:
        try:
            value = getattr(file, name)
        except Exception:  # a damaged vendor block must not cost the image
            continue
        if value:
            found[name] = value
    tags: dict[str, Any] = {}
    for tag in page.tags.values():
        if tag.code in PIXEL_TAGS and tag.code not in (270, 271, 272):
            continue
        try:
            value = tag.value
        except Exception:
            continue
        if isinstance(value, bytes) and len(value) < 1 << 20:
            value = value.decode("utf-8", "replace")
        if isinstance(value, str | int | float | tuple):
            tags[tag.name] = value
    found["tags"] = tags
    return found


def _short(error: Exception) -> str:
    text = " ".join(str(error).split()) or type(error).__name__
    return text if len(text) <= 120 else text[:117] + "..."


@contextmanager
def _quiet() -> Iterator[None]:
    """Keep the reader's complaints about odd files from the user's terminal."""
    logger = logging.getLogger("tifffile")
    before = logger.disabled
    logger.disabled = True
    try:
        yield
    finally:
        logger.disabled = before
