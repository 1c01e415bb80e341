"""From stored channels to one grey channel, refusing what only looks like one."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from phaseid.errors import InputError
from phaseid.image.notices import Finding

# A JPEG turns equal channels into ones that differ by a level or two.
SAME_WITHIN = 4
# Scale bars, arrows and outlines cover little; more colour than this is no annotation.
MOST_COLOURED = 0.10
# Successive entries of a pseudo-colour table differ by little (common practice: 256 smooth steps).
LARGEST_STEP = 40


def to_grey(
    data: NDArray[Any], palette: NDArray[Any] | None, where: str
) -> tuple[NDArray[Any], NDArray[np.bool_] | None, tuple[Finding, ...]]:
    """Reduce channels to grey.

    Parameters
    ----------
    data : ndarray of shape (rows, columns) or (rows, columns, channels)
    palette : ndarray of shape (entries, 3) or None
        Colours of a palette image, whose `data` are indices.
    where : str
        Name for messages.

    Returns
    -------
    grey : ndarray of shape (rows, columns)
    unusable : ndarray of bool or None
        Coloured annotations.
    flags : tuple of Finding

    Raises
    ------
    InputError
        If the image is in colour.
    """
    if palette is not None and data.ndim == 2:
        return _indexed(data, palette, where)
    if data.ndim == 3 and data.shape[-1] == 1:
        return data[..., 0], None, ()
    if data.ndim != 3 or data.shape[-1] not in (2, 3, 4):
        return data, None, ()
    if data.shape[-1] == 2:
        return data[..., 0], None, ()
    # Channel by channel and without a wide copy: mosaics come as RGB too.
    high = np.maximum(np.maximum(data[..., 0], data[..., 1]), data[..., 2])
    low = np.minimum(np.minimum(data[..., 0], data[..., 1]), data[..., 2])
    limit = SAME_WITHIN if data.dtype.itemsize == 1 else SAME_WITHIN * 257
    if data.dtype.kind == "f":
        limit = 0.015 * float(high.max() - low.min() or 1.0)  # type: ignore[assignment]
    coloured = (high - low) > limit
    share = float(coloured.mean())
    grey = np.ascontiguousarray(data[..., 1])
    if share > MOST_COLOURED:
        raise InputError(
            f"{where} is a colour image ({share:.0%} of its pixels are coloured); give the grey image "
            "as the detector recorded it, not a screenshot or an overlay."
        )
    if share == 0.0:
        return grey, None, ()
    flag = Finding(
        "annotated",
        f"{share:.2%} of the pixels are coloured (annotations); they are left out.",
        "Use the image without annotations.",
    )
    return grey, _grown(coloured), (flag,)


def _indexed(
    data: NDArray[Any], palette: NDArray[Any], where: str
) -> tuple[NDArray[Any], None, tuple[Finding, ...]]:
    used = palette[: int(data.max()) + 1].astype(int)
    grey = bool(np.all(np.ptp(used, axis=1) <= SAME_WITHIN))
    if grey:
        steps = np.diff(used[:, 0])
        if len(steps) == 0 or np.all(steps == steps[0]):
            return data, None, ()
        flag = Finding(
            "palette-not-linear",
            "The file's grey palette is not a straight line; the raw greys (the indices) are used.",
            "Nothing, unless the palette is the original signal.",
            "note",
        )
        return data, None, (flag,)
    if len(used) > 64 and np.abs(np.diff(used, axis=0)).max() <= LARGEST_STEP:
        flag = Finding(
            "false-colour",
            "The file shows its greys in false colours; the raw greys (the indices) are used.",
            "Check that the index is the recorded signal.",
        )
        return data, None, (flag,)
    raise InputError(
        f"{where} is a colour image with a palette of {len(used)} colours; give the grey image as the "
        "detector recorded it."
    )


def _grown(mask: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Add one pixel around: the rim of an annotation is a blend."""
    grown = mask.copy()
    grown[1:] |= mask[:-1]
    grown[:-1] |= mask[1:]
    wide = grown.copy()
    wide[:, 1:] |= grown[:, :-1]
    wide[:, :-1] |= grown[:, 1:]
    return wide
