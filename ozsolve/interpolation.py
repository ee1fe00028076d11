"""Starting guesses by interpolation through scattered solved states.

gamma at fixed densities is a smooth function of the few reduced depths. Gaussian radial basis
functions with a constant take any number of scattered points (Fasshauer, Meshfree Approximation
Methods with MATLAB (2007), chapters 1 and 6); the guess only has to be good enough to save steps.
"""

from __future__ import annotations

import numpy as np

from ozsolve.potential import Array

WIDTH = 2.0
"""Width of the basis in reduced depth; gamma varies over depths of about one."""
RIDGE = 1e-9
"""Relative ridge on the kernel matrix: keeps weights moderate when points nearly coincide."""
MOST_POINTS = 64
"""Points remembered; more cost more than the steps they save."""


class Scatter:
    """Vectors known at scattered points, and guesses between them."""

    def __init__(self) -> None:
        self._points: list[Array] = []
        self._values: list[Array] = []
        self._inverse: Array | None = None
        self._stacked: Array | None = None

    @property
    def known(self) -> int:
        """How many points are remembered."""
        return len(self._points)

    def add(self, point: Array, value: Array) -> None:
        """Remember a value of shape (size,) at a point of shape (d,)."""
        if len(self._points) < MOST_POINTS:
            self._points.append(point)
            self._values.append(value)
            self._inverse = None

    def at(self, point: Array) -> Array | None:
        """The guess at a point; None when nothing is known yet."""
        if not self._points:
            return None
        if self._inverse is None:
            self._prepare()
        assert self._inverse is not None
        assert self._stacked is not None
        right = np.append(_kernel(self._where, point[None])[:, 0], 1.0)
        return np.asarray((self._inverse @ right)[:-1] @ self._stacked)

    def _prepare(self) -> None:
        self._where = np.array(self._points)
        self._stacked = np.array(self._values)
        size = len(self._where)
        matrix = np.ones((size + 1, size + 1))
        matrix[:size, :size] = _kernel(self._where, self._where) + RIDGE * np.eye(size)
        matrix[size, size] = 0.0
        self._inverse = np.asarray(np.linalg.pinv(matrix), dtype=np.float64)


def _kernel(a: Array, b: Array) -> Array:
    squared = np.sum((a[:, None, :] - b[None, :, :]) ** 2, axis=-1)
    return np.asarray(np.exp(-squared / (2.0 * WIDTH**2)))


def spread_order(points: Array) -> list[int]:
    """Order points of shape (n, d) so that every beginning is spread out: farthest point next.

    The first is the one closest to the origin, the easiest state to reach from hard spheres.
    """
    first = int(np.argmin(np.sum(points**2, axis=1)))
    order = [first]
    distance = np.sum((points - points[first]) ** 2, axis=1)
    for _ in range(len(points) - 1):
        distance[order[-1]] = -1.0
        following = int(np.argmax(distance))
        order.append(following)
        distance = np.where(
            distance < 0.0, -1.0, np.minimum(distance, np.sum((points - points[following]) ** 2, axis=1))
        )
    return order
