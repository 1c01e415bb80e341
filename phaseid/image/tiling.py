"""Several images in one: straight joins across the whole frame."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from phaseid.image.noise import NoiseLaw
from phaseid.image.notices import Finding

# A join is a step at nearly every pixel of a full row or column, of either sign.
LEAST_SHARE = 0.5
LEAST_EXCESS = 0.25
MARGIN = 0.08
# Rows away from a join at which the two sides are compared; wider than most cracks.
REACH = 16
MOST_SAMPLES = 768


def joins_of(data: NDArray[Any], noise: NoiseLaw) -> list[Finding]:
    """Look for rows and columns where unrelated images meet.

    Parameters
    ----------
    data : ndarray of shape (rows, columns)
    noise : NoiseLaw

    Returns
    -------
    list of Finding
    """
    sd = float(noise.sd(np.median(data[::5, ::5])))
    across = _jumps(data, sd)
    down = _jumps(data.T, sd)
    panels = (len(across) + 1) * (len(down) + 1)
    if panels < 2:
        return []
    places = [f"row {r}" for r in across[:3]] + [f"column {c}" for c in down[:3]]
    return [
        Finding(
            "several-images",
            f"The picture seems to be put together of {panels} images (joins at {', '.join(places)}); their "
            "grey scales may differ.",
            "Analyse each image by itself, or use a stitched mosaic without borders.",
            "caution",
        )
    ]


def _jumps(data: NDArray[Any], sd: float) -> list[int]:
    """Rows at which the picture changes as a whole."""
    rows, columns = data.shape
    if rows < 64 or columns < 32:
        return []
    thin = data[:, :: max(1, columns // MOST_SAMPLES)].astype(np.float32)
    # Two rows apart on either side of a row, so that a drawn line between panels is stepped over.
    wide = np.abs(thin[4:] - thin[:-4]) > 5.0 * max(sd, 0.5)
    share = wide.mean(axis=1)
    near = np.median(share)
    strong = np.flatnonzero((share > LEAST_SHARE) & (share > near + LEAST_EXCESS)) + 2
    margin = int(MARGIN * rows)
    found: list[int] = []
    for row in strong:
        if not margin <= row < rows - margin:
            continue
        if found and row - found[-1] <= 8:
            continue
        # A crack along the rows has the same material on either side; two images have not.
        beyond = np.abs(thin[min(int(row) + REACH, rows - 1)] - thin[max(int(row) - REACH, 0)])
        if np.mean(beyond > 5.0 * max(sd, 0.5)) < LEAST_EXCESS:
            continue
        # A border between phases is a step of one sign along the row; a join has both.
        step = thin[min(int(row) + 3, rows - 1)] - thin[max(int(row) - 3, 0)]
        sign = np.sign(step[np.abs(step) > 5.0 * max(sd, 0.5)])
        if len(sign) and min(np.mean(sign > 0), np.mean(sign < 0)) > 0.1:
            found.append(int(row))
    return found
