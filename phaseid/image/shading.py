"""Slow changes of the grey across the image that no phase makes."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

# F ratio that chance does not reach.
SIGNIFICANT = 5.0


@dataclass(frozen=True, eq=False)
class Shading:
    """A smooth surface plus an offset per row, in units of the noise axis.

    Attributes
    ----------
    shape : (int, int)
    coefficients : ndarray of shape (order + 1, order + 1)
        Of Legendre polynomials down the rows and along the columns; the constant is zero.
    lines : ndarray of shape (rows,) or None
        Offset of each row.
    """

    shape: tuple[int, int]
    coefficients: FloatArray = field(default_factory=lambda: np.zeros((1, 1)))
    lines: FloatArray | None = None

    @property
    def none(self) -> bool:
        """Whether there is nothing to take off."""
        return self.lines is None and not self.coefficients.any()

    def over(self, row: int, rows: int, column: int, columns: int) -> NDArray[np.float32]:
        """Surface over a block that may reach beyond the frame."""
        total = self._surface(np.arange(row, row + rows), np.arange(column, column + columns))
        if self.lines is not None:
            at = np.arange(row, row + rows)
            last = self.shape[0] - 1
            at = np.abs(at)
            at = np.clip(np.where(at > last, 2 * last - at, at), 0, last)
            total += self.lines[at].astype(np.float32)[:, None]
        return total

    def _surface(self, rows: NDArray[np.intp], columns: NDArray[np.intp]) -> NDArray[np.float32]:
        order = self.coefficients.shape[0] - 1
        down = legendre(rows, self.shape[0], order)
        along = legendre(columns, self.shape[1], order)
        surface = down.T.astype(np.float32) @ self.coefficients.astype(np.float32)
        return np.asarray(surface @ along.astype(np.float32))

    def at(self, rows: NDArray[np.int64], columns: FloatArray) -> FloatArray:
        """Surface at single places."""
        order = self.coefficients.shape[0] - 1
        down = legendre(rows, self.shape[0], order)
        along = legendre(columns, self.shape[1], order)
        total = np.einsum("in,ij,jn->n", down, self.coefficients, along)
        if self.lines is not None:
            total += self.lines[np.clip(rows, 0, self.shape[0] - 1)]
        return np.asarray(total)

    def amplitude(self) -> float:
        """Difference between the highest and the lowest point of the smooth surface."""
        rows = np.linspace(0, self.shape[0] - 1, 64).astype(np.intp)
        columns = np.linspace(0, self.shape[1] - 1, 64).astype(np.intp)
        return float(np.ptp(self._surface(rows, columns)))


def legendre(at: NDArray[Any], length: int, order: int) -> FloatArray:
    """Legendre polynomials 0 to `order` over 0..length-1, shape (order + 1, len(at))."""
    x = 2.0 * np.asarray(at, dtype=float) / max(length - 1, 1) - 1.0
    return np.asarray(
        np.polynomial.legendre.legvander(np.clip(x, -1.2, 1.2), order).T, dtype=np.float64
    )


def slope_terms(
    rows: FloatArray, columns: FloatArray, shape: tuple[int, int], order: int
) -> tuple[FloatArray, FloatArray]:
    """Slopes down and along, per pixel, of every term of the surface but the constant.

    Returns
    -------
    down, along : ndarray of shape (places, terms)
        Terms in the order of `term_indices`.
    """
    p_down, p_along = legendre(rows, shape[0], order), legendre(columns, shape[1], order)
    d_down = _slope(rows, shape[0], order)
    d_along = _slope(columns, shape[1], order)
    terms = term_indices(order)
    down = np.stack([d_down[i] * p_along[j] for i, j in terms], axis=1)
    along = np.stack([p_down[i] * d_along[j] for i, j in terms], axis=1)
    return down, along


def term_indices(order: int) -> list[tuple[int, int]]:
    """Degrees (down, along) of the terms up to a total degree."""
    return [(i, j) for i in range(order + 1) for j in range(order + 1 - i) if i + j > 0]


def _slope(at: FloatArray, length: int, order: int) -> FloatArray:
    x = 2.0 * at / max(length - 1, 1) - 1.0
    scale = 2.0 / max(length - 1, 1)
    rows = []
    for degree in range(order + 1):
        coefficient = np.zeros(degree + 1)
        coefficient[degree] = 1.0
        derived = np.polynomial.legendre.legder(coefficient)
        rows.append(scale * np.polynomial.legendre.legval(x, derived))
    return np.array(rows)


def surface_from_slopes(
    slopes: FloatArray, shape: tuple[int, int], order: int = 3
) -> Shading | None:
    """Fit a surface to slopes measured inside grains, where only shading can make them.

    Parameters
    ----------
    slopes : ndarray of shape (blocks, 5)
        Row, column, slope down, slope along, weight.
    shape : (int, int)
    order : int
        Largest total degree.

    Returns
    -------
    Shading or None
        None where there are too few places, or nothing significant.
    """
    if len(slopes) < 12:
        return None
    down, along = slope_terms(slopes[:, 0], slopes[:, 1], shape, order)
    design = np.concatenate([down, along])
    seen = np.concatenate([slopes[:, 2], slopes[:, 3]])
    weight = np.concatenate([slopes[:, 4]] * 2)
    scale = np.abs(design).max(axis=0)
    coefficient = np.zeros(design.shape[1])
    robust = np.ones(len(seen))
    for _ in range(15):
        root = np.sqrt(weight * robust)
        solved, *_ = np.linalg.lstsq(design / scale * root[:, None], seen * root, rcond=1e-6)
        coefficient = solved / scale
        residual = np.abs(seen - design @ coefficient)
        typical = 1.4826 * float(np.median(residual)) + 1e-15
        robust = 1.0 / np.maximum(1.0, residual / (1.5 * typical))
    explained = float(np.sum(weight * robust * seen**2))
    left = float(np.sum(weight * robust * (seen - design @ coefficient) ** 2))
    freedom = len(seen) - len(coefficient)
    ratio = (explained - left) / len(coefficient) / max(left / max(freedom, 1), 1e-300)
    if freedom < 4 or ratio < SIGNIFICANT:
        return None
    table = np.zeros((order + 1, order + 1))
    for (i, j), value in zip(term_indices(order), coefficient, strict=True):
        table[i, j] = value
    return Shading(shape, table)
