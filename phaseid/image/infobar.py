"""The strip of text an instrument burns into the foot (or head) of an image."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

# A strip is a plain background with text: these shares hold for every layout seen (common practice).
LARGEST_SHARE = 0.35
SMALLEST_ROWS = 8
BACKGROUND_SHARE = 0.5
ROW_PLAIN_SHARE = 0.85
TEXT_SHARE = (0.004, 0.5)


def used_rows(data: NDArray[Any], stated_rows: int | None = None) -> tuple[int, int]:
    """Find the rows that are image.

    Parameters
    ----------
    data : ndarray of shape (rows, columns)
    stated_rows : int, optional
        Height of the image proper according to the metadata.

    Returns
    -------
    first, end : int
        Rows `first` to `end - 1` are image.
    """
    rows = data.shape[0]
    if stated_rows is not None and 0 < stated_rows < rows and _is_strip(data[stated_rows:]):
        return 0, stated_rows
    end = rows - _strip_height(data[::-1])
    first = _strip_height(data) if end == rows else 0
    return first, end


def _strip_height(data: NDArray[Any]) -> int:
    """Rows of a strip that begins at the first row of `data`."""
    rows = data.shape[0]
    limit = int(LARGEST_SHARE * rows)
    if limit < SMALLEST_ROWS:
        return 0
    head = data[:limit]
    tolerance = _tolerance(data)
    background = _mode(head[: max(SMALLEST_ROWS, limit // 12)])
    plain = _plain_rows(head, background, tolerance)
    if plain[:SMALLEST_ROWS].mean() < 0.75:
        return 0
    # A text line may break the run for a row or two; the picture breaks it for good.
    height = 0
    misses = 0
    for row in range(limit):
        if plain[row]:
            height, misses = row + 1, 0
        else:
            misses += 1
            if misses > 3:
                break
    if height < SMALLEST_ROWS or height >= limit:
        return 0
    return height if _is_strip(head[:height]) else 0


def _tolerance(data: NDArray[Any]) -> float:
    span = float(data.max()) - float(data.min())
    return max(0.012 * span, 1.0) if data.dtype.kind == "u" else 0.012 * span


def _mode(data: NDArray[Any]) -> float:
    values, counts = np.unique(data, return_counts=True)
    return float(values[np.argmax(counts)])


def _plain_rows(data: NDArray[Any], background: float, tolerance: float) -> NDArray[np.bool_]:
    """Rows that consist of the background or of saturated text and lines."""
    low, high = float(data.min()), float(data.max())
    text = high if high - background > background - low else low
    values = data.astype(np.float32)
    near = (np.abs(values - background) <= tolerance) | (np.abs(values - text) <= 4 * tolerance)
    return np.asarray(near.mean(axis=1) >= ROW_PLAIN_SHARE - 0.15)


def _is_strip(strip: NDArray[Any]) -> bool:
    if strip.shape[0] < SMALLEST_ROWS:
        return False
    background = _mode(strip)
    values = strip.astype(np.float32)
    away = np.abs(values - background)
    span = float(away.max())
    if span == 0:
        return False
    same = float(np.mean(away <= 0.012 * span))
    text = float(np.mean(away > 0.4 * span))
    # Text is drawn, not recorded: neighbours in the background are exactly equal.
    still = float(np.mean(strip[:, 1:] == strip[:, :-1]))
    return same >= BACKGROUND_SHARE and TEXT_SHARE[0] <= text <= TEXT_SHARE[1] and still > 0.5
