"""From a file or an array to a `GreyImage`."""

from __future__ import annotations

import hashlib
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from phaseid.errors import InputError
from phaseid.image.channels import to_grey
from phaseid.image.greyimage import GreyImage, checked_data
from phaseid.image.metadata import read_conditions
from phaseid.image.notices import Finding
from phaseid.image.tiff import is_tiff, read_tiff

__all__ = ["GreyImage", "from_array", "read_image"]

CHUNK = 1 << 22


def read_image(path: Path | str, page: int | None = None) -> GreyImage:
    """Read a grey image with its metadata.

    Parameters
    ----------
    path : Path or str
        TIFF, PNG, JPEG, BMP or whatever else Pillow reads.
    page : int, optional
        Which page of a file of several; by default the largest one, the first of them if several are.

    Returns
    -------
    GreyImage

    Raises
    ------
    InputError
        If the file cannot be read or holds no grey image.
    """
    path = Path(path)
    if path.is_dir():
        raise InputError(f"{path} is a folder; give the path of an image file.")
    if not path.exists():
        raise InputError(f"{path} does not exist; check the path.")
    try:
        digest = _hash_file(path)
        size = path.stat().st_size
    except OSError as error:
        raise InputError(
            f"{path} cannot be read: {error.strerror or error}; check its permissions."
        ) from None
    if size == 0:
        raise InputError(f"{path} is empty; copy it again from its source.")
    raw = read_tiff(path, page) if is_tiff(path) else _read_other(path, page)
    grey, unusable, flags = to_grey(raw.data, raw.palette, str(path))
    grey = checked_data(grey, str(path))
    conditions = read_conditions(raw.metadata, grey.shape, path)
    return GreyImage(
        data=grey,
        path=str(path),
        bits=raw.bits if grey.dtype.kind == "u" else 32,
        pixel_size_nm=conditions.pixel_size_nm,
        energy_keV=conditions.energy_keV,
        detector=conditions.detector,
        tilt_deg=conditions.tilt_deg,
        sha256=digest,
        page=raw.page,
        pages=raw.pages,
        provenance={"reader": raw.reader, **conditions.provenance},
        flags=(*raw.flags, *flags, *conditions.flags),
        unusable=unusable,
    )


def from_array(
    data: Any,
    *,
    name: str = "the array",
    bits: int | None = None,
    pixel_size_nm: float | None = None,
    energy_keV: float | None = None,
    detector: str | None = None,
    tilt_deg: float | None = None,
) -> GreyImage:
    """Take an image from Python.

    Parameters
    ----------
    data : array-like of shape (rows, columns), or (rows, columns, channels)
        A numpy array, or anything numpy can convert, such as an xarray object. Where the object has
        `attrs`, conditions named `pixel_size_nm`, `energy_keV`, `detector` and `tilt_deg` are taken from it.
    name : str
        What to call it in messages.
    bits : int, optional
        Bits that carry grey, where fewer than the type holds (12-bit greys in 16 bits).
    pixel_size_nm, energy_keV, detector, tilt_deg : optional
        Conditions; they override `attrs`.

    Returns
    -------
    GreyImage

    Raises
    ------
    InputError
        If it is no grey image.
    """
    attrs = getattr(data, "attrs", None)
    attrs = dict(attrs) if attrs is not None else {}
    try:
        array = np.asarray(data)
    except (TypeError, ValueError) as error:
        raise InputError(
            f"{name} cannot be converted to an array ({error}); give rows and columns of greys."
        ) from None
    grey, unusable, flags = to_grey(array, None, name)
    grey = checked_data(np.array(grey), name)

    def chosen(given: Any, key: str) -> Any:
        return given if given is not None else attrs.get(key)

    digest = hashlib.sha256(f"{grey.shape}{grey.dtype}".encode())
    digest.update(np.ascontiguousarray(grey).data)
    return GreyImage(
        data=grey,
        path=name,
        bits=bits or (32 if grey.dtype.kind == "f" else 8 * grey.dtype.itemsize),
        pixel_size_nm=_number(chosen(pixel_size_nm, "pixel_size_nm")),
        energy_keV=_number(chosen(energy_keV, "energy_keV")),
        detector=chosen(detector, "detector"),
        tilt_deg=_number(chosen(tilt_deg, "tilt_deg")),
        sha256=digest.hexdigest(),
        provenance={"reader": "array"},
        flags=flags,
        unusable=unusable,
    )


def _number(value: Any) -> float | None:
    return None if value is None else float(value)


def _hash_file(path: Path) -> str:
    digest = hashlib.sha256()
    with path.open("rb") as stream:
        while chunk := stream.read(CHUNK):
            digest.update(chunk)
    return digest.hexdigest()


def _read_other(path: Path, page: int | None) -> Any:
    """Read anything Pillow knows."""
    import warnings

    from PIL import Image, UnidentifiedImageError

    from phaseid.image.tiff import RawPage

    flags: list[Finding] = []
    try:
        with warnings.catch_warnings():
            # Large mosaics are normal here; the size was chosen by the user, not by a stranger.
            warnings.simplefilter("ignore", Image.DecompressionBombWarning)
            with Image.open(path) as opened:
                picture: Image.Image = opened
                pages = int(getattr(picture, "n_frames", 1))
                if page is not None and not 0 <= page < pages:
                    raise InputError(
                        f"{path} has {pages} page(s), numbered from 0; page {page} does not exist."
                    )
                picture.seek(page or 0)
                palette: NDArray[Any] | None = None
                if picture.mode in ("P", "PA"):
                    palette = np.array(picture.getpalette("RGB") or [], dtype=np.uint8)
                    palette = palette.reshape(-1, 3)
                if picture.mode == "CMYK" or picture.mode in ("YCbCr", "LAB", "HSV"):
                    picture = picture.convert("RGB")
                data = np.array(picture)
                texts = {str(k): v for k, v in picture.info.items() if isinstance(v, str)}
                resolution = picture.info.get("dpi")
    except InputError:
        raise
    except UnidentifiedImageError:
        raise InputError(
            f"{path} is not an image this tool can read, whatever its name says; export it as TIFF or PNG."
        ) from None
    except Image.DecompressionBombError:
        raise InputError(
            f"{path} holds too many pixels for its format's reader; save the mosaic as TIFF."
        ) from None
    except (OSError, SyntaxError, ValueError, EOFError) as error:
        raise InputError(
            f"{path} is damaged or cut short ({error}); copy it again from its source."
        ) from None
    if path.suffix.lower() in (".jpg", ".jpeg"):
        flags.append(
            Finding(
                "lossy-compression",
                f"{path.name} is a JPEG: its compression shifts greys in blocks of 8 pixels.",
                "Export the image as TIFF or PNG from the instrument.",
            )
        )
    bits = 16 if data.dtype.itemsize > 1 else 8
    return RawPage(
        data, palette, bits, page or 0, pages, "Pillow", {"text": texts, "dpi": resolution}, flags
    )
