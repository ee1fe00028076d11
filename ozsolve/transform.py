"""Radial Fourier transforms of stacks of functions; owns plans and buffers.

F(k) = (4 pi/k) int r f(r) sin(kr) dr and f(r) = (1/(2 pi^2 r)) int k F(k) sin(kr) dk, each as one
type-I sine transform of the sampled function. Plans are estimated, never measured, so that the same
input gives the same bits on every run.
"""

from __future__ import annotations

import math
from functools import lru_cache

import numpy as np
import pyfftw

from ozsolve.grid import Grid
from ozsolve.potential import Array


class RadialTransform:
    """Transforms of stacks of shape (rows, points - 1) on one grid.

    The stacks hold r f(r) and F(k): the factor r rides along because the solver iterates on r gamma.
    The inverse applies the grid's filter.
    """

    def __init__(self, spacing: float, points: int, rows: int) -> None:
        grid = Grid(spacing, points)
        shape = (rows, points - 1)
        self.input = pyfftw.zeros_aligned(shape, dtype="float64")
        self._out = pyfftw.zeros_aligned(shape, dtype="float64")
        self._plan = pyfftw.FFTW(
            self.input, self._out, axes=(-1,), direction=("FFTW_RODFT00",), flags=("FFTW_ESTIMATE",), threads=1
        )
        self._to_k = 2.0 * math.pi * spacing / grid.k
        self._k_filtered = grid.k * grid.filter / (4.0 * math.pi * points * spacing)
        self.count = 0

    def forward(self, rf_r: Array | None = None) -> Array:
        """F(k), shape (rows, points - 1), from r f(r), or from what was written into `input`."""
        if rf_r is not None:
            self.input[:] = rf_r
        self._plan.execute()
        self.count += 1
        return np.asarray(self._out * self._to_k)

    def inverse(self, f_k: Array) -> Array:
        """r f(r), shape (rows, points - 1), from F(k), filtered near the largest wave number."""
        np.multiply(f_k, self._k_filtered, out=self.input)
        self._plan.execute()
        self.count += 1
        return np.array(self._out)


@lru_cache(maxsize=64)
def plan(spacing: float, points: int, rows: int) -> RadialTransform:
    """The transform for this grid and stack height, made once and kept."""
    return RadialTransform(spacing, points, rows)
