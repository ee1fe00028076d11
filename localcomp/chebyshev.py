"""Interpolation at Chebyshev points on [0, 1], ends included (Trefethen, Approximation Theory and
Approximation Practice (2013), chapters 2 to 6)."""

from __future__ import annotations

import numpy as np
from numpy.polynomial import chebyshev
from numpy.typing import NDArray

Array = NDArray[np.float64]


def chebyshev_points(degree: int) -> Array:
    """degree + 1 points from 0 to 1, exact at the ends; those of half the degree are among them."""
    points = 0.5 * (1.0 - np.cos(np.pi * np.arange(degree + 1) / degree))
    points[0], points[-1] = 0.0, 1.0
    return points


class Interpolant:
    """The polynomial through values at `chebyshev_points`.

    Parameters
    ----------
    values : ndarray, shape (degree + 1, ...)
    """

    def __init__(self, values: Array) -> None:
        degree = len(values) - 1
        points = 2.0 * chebyshev_points(degree) - 1.0
        flat = np.asarray(values, dtype=np.float64).reshape(degree + 1, -1)
        self._shape = values.shape[1:]
        self.coefficients: Array = np.asarray(np.linalg.solve(chebyshev.chebvander(points, degree), flat), np.float64)

    def __call__(self, s: Array) -> Array:
        """Values at s of shape (m,); shape (m, ...)."""
        return self._evaluate(self.coefficients, s)

    def slope(self, s: Array) -> Array:
        """Derivative by s."""
        return self._evaluate(np.asarray(2.0 * chebyshev.chebder(self.coefficients), np.float64), s)

    def integral(self, s: Array) -> Array:
        """Integral from 0 to s."""
        return self._evaluate(np.asarray(chebyshev.chebint(0.5 * self.coefficients, lbnd=-1), np.float64), s)

    def shortened(self) -> Interpolant:
        """Without its last two coefficients: what the difference says about the ones left out."""
        short = object.__new__(Interpolant)
        short._shape = self._shape
        short.coefficients = self.coefficients[:-2] if len(self.coefficients) > 3 else self.coefficients[:1]
        return short

    def _evaluate(self, coefficients: Array, s: Array) -> Array:
        found = chebyshev.chebval(2.0 * np.asarray(s) - 1.0, coefficients, tensor=True)
        return np.asarray(np.moveaxis(np.atleast_2d(found), 0, -1), np.float64).reshape(len(s), *self._shape)
