"""Offsets from row to row: line noise, and bands that charge."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from phaseid.image.canvas import Canvas

FloatArray = NDArray[np.float64]

LAGS = (1, 2, 4, 8, 16)
MOST_COLUMNS = 1024
STRIP = 256
# A difference beyond this many noise standard deviations is a border, not an offset.
CLIP = 4.0
# Rows scatter by chance; this many times more is line noise, this many standard errors a jump.
LINE_EXCESS = 1.6
JUMP = 9.0
LEAST_JUMP = 0.5
LINE_REACH = 12.0
# A band ends where the grey is back to within this share of the jump, or after this share of the rows.
BACK = 0.15
LONGEST_BAND = 0.2
MOST_DOUBTFUL = 0.7


@dataclass(frozen=True, eq=False)
class RowOffsets:
    """Offsets of the rows, on the noise axis.

    Attributes
    ----------
    lines : ndarray of shape (rows,) or None
        What changes from row to row.
    bands : ndarray of shape (rows,) or None
        The same with what lasts for many rows after a jump.
    line_sd : float
    largest_jump : float
    doubtful : ndarray of bool, shape (rows,), or None
        Rows in and after bands, where the correction leaves something behind.
    """

    lines: FloatArray | None
    bands: FloatArray | None
    line_sd: float
    largest_jump: float
    doubtful: NDArray[np.bool_] | None = None


def row_offsets(canvas: Canvas) -> RowOffsets:
    """Estimate row offsets from differences between rows a few apart.

    Parameters
    ----------
    canvas : Canvas

    Returns
    -------
    RowOffsets
    """
    rows = canvas.data.shape[0]
    if rows < 4 * LAGS[-1]:
        return RowOffsets(None, None, 0.0, 0.0)
    step = max(1, canvas.data.shape[1] // MOST_COLUMNS)
    columns = len(range(0, canvas.data.shape[1], step))
    error = np.sqrt(2.0 / columns * (1.0 if step > 3 else 1 + 2 * sum(canvas.axis.noise.row)))
    differences = _differences(canvas, step)
    first = differences[0]
    middle = float(np.median(first))
    scatter = 1.4826 * float(np.median(np.abs(first - middle)))
    profile = _integrated(differences, rows)
    lines = profile - _lowpass(profile, LINE_REACH)
    line_sd = 1.4826 * float(np.median(np.abs(lines)))
    lines = np.clip(lines, -5 * max(line_sd, error), 5 * max(line_sd, error))
    noisy = scatter > LINE_EXCESS * error and line_sd > 0.03
    threshold = max(JUMP * max(scatter, error), LEAST_JUMP)
    jumps = np.abs(first) > threshold
    bands, doubtful = _bands(profile, np.flatnonzero(jumps)) if jumps.any() else (None, None)
    largest = float(np.abs(first[jumps]).max()) if jumps.any() else 0.0
    return RowOffsets(lines if noisy else None, bands, line_sd, largest, doubtful)


def _differences(canvas: Canvas, step: int) -> list[FloatArray]:
    """Mean of the clipped differences between rows, per lag."""
    rows = canvas.data.shape[0]
    found: list[FloatArray] = [np.zeros(rows - lag) for lag in LAGS]
    table = canvas.axis.table(canvas.data.dtype)
    for first in range(0, rows, STRIP):
        raw = canvas.data[first : first + STRIP + LAGS[-1], ::step]
        z = canvas.axis.forward(raw) if table is None else table[raw]
        for n, lag in enumerate(LAGS):
            stop = min(STRIP, rows - lag - first)
            if stop <= 0:
                continue
            difference = z[lag : lag + stop] - z[:stop]
            # The bulk of the columns stays in its phase: centre on it, then average it.
            middle = np.median(difference, axis=1, keepdims=True)
            difference -= middle
            np.clip(difference, -CLIP, CLIP, out=difference)
            found[n][first : first + stop] = difference.mean(axis=1) + middle[:, 0]
    return found


def _integrated(differences: list[FloatArray], rows: int) -> FloatArray:
    """Profile whose differences at all lags fit best, by banded normal equations."""
    from scipy.linalg import solveh_banded

    band = np.zeros((LAGS[-1] + 1, rows))
    right = np.zeros(rows)
    band[0] += 1e-9
    for lag, difference in zip(LAGS, differences, strict=True):
        weight = 1.0 / (1.0 + lag / 8.0)
        band[0, :-lag] += weight
        band[0, lag:] += weight
        band[lag, : rows - lag] -= weight
        right[lag:] += weight * difference
        right[:-lag] -= weight * difference
    profile = solveh_banded(band, right, lower=True)
    return np.asarray(profile - profile.mean())


def _bands(profile: FloatArray, jumps: NDArray[np.intp]) -> tuple[FloatArray, NDArray[np.bool_]]:
    """What bands add to a straight line between the rows before and after them; 0 elsewhere."""
    rows = len(profile)
    bands = np.zeros(rows)
    doubtful = np.zeros(rows, dtype=bool)
    done = 0
    for jump in jumps:
        if jump < done:
            continue
        before = float(np.median(profile[max(0, jump - 5) : jump + 1]))
        height = float(profile[jump + 1] - profile[jump])
        last = min(rows - 1, int(jump + LONGEST_BAND * rows))
        end = min(jump + 3, rows - 1)
        while end < last and abs(float(np.median(profile[end : end + 5])) - before) > BACK * abs(
            height
        ):
            end += 1
        after = float(np.median(profile[end : end + 5]))
        span = np.arange(jump + 1, end)
        line = before + (after - before) * (span - jump) / max(end - jump, 1)
        bands[span] = profile[span] - line
        # The tail of the decay goes on for as long again.
        doubtful[max(0, jump - 1) : end + (end - jump)] = True
        done = end
    if doubtful.mean() > MOST_DOUBTFUL:
        doubtful = np.abs(bands) > np.quantile(np.abs(bands), 1 - MOST_DOUBTFUL)
    return bands, doubtful


def _lowpass(profile: FloatArray, reach: float) -> FloatArray:
    size = int(3 * reach)
    offsets = np.arange(-size, size + 1)
    kernel = np.exp(-0.5 * (offsets / reach) ** 2)
    padded = np.pad(profile, size, mode="reflect" if len(profile) > size else "symmetric")
    return np.convolve(padded, kernel / kernel.sum(), mode="valid")
