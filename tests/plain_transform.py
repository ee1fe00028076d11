"""The Ornstein-Zernike relation done the plain way, sharing nothing with the engine but its gamma(r).

All steps of the potential are put on grid points of a fine grid and get half their weight there, which
makes the plain sum second order; transforms by scipy, the matrix relation by numpy.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from scipy.fft import dst
from scipy.interpolate import CubicSpline

from ozsolve import Solution

SPACING = 0.0025
CLOSURES = {
    "msa": lambda gamma, b: 1.0 + gamma + b,
    "py": lambda gamma, b: np.exp(b) * (1.0 + gamma),
    "hnc": lambda gamma, b: np.exp(b + gamma),
}


@dataclass(frozen=True)
class PlainResult:
    """Arrays of shape (s, s, m): g of the closure, h = c + gamma of the plain relation, c(k), h(k) of that g."""

    r: np.ndarray
    k: np.ndarray
    g_r: np.ndarray
    h_r: np.ndarray
    c_k: np.ndarray
    h_k: np.ndarray


def forward(f_r: np.ndarray, r: np.ndarray, k: np.ndarray) -> np.ndarray:
    """(4 pi/k) int r f sin(kr) dr."""
    return 2.0 * math.pi * SPACING / k * dst(r * f_r, type=1, axis=-1)


def inverse(f_k: np.ndarray, r: np.ndarray, k: np.ndarray) -> np.ndarray:
    """1/(2 pi^2 r) int k F sin(kr) dk."""
    return k[0] / (4.0 * math.pi**2 * r) * dst(k * f_k, type=1, axis=-1)


def step(r: np.ndarray, edge: float) -> np.ndarray:
    """1 inside, 0 outside, 1/2 on the edge, which must be a grid point."""
    assert abs(edge / SPACING - round(edge / SPACING)) < 1e-6, "put every step on a grid point"
    return np.where(np.abs(r - edge) < SPACING / 2, 0.5, (r < edge).astype(float))


def plain(solution: Solution, closure: str) -> PlainResult:
    """One pass of gamma -> c -> h with the named closure written out here."""
    count = math.ceil(1.1 * solution.r[-1] / SPACING)
    index = np.arange(1, count)
    r, k = SPACING * index, math.pi / (count * SPACING) * index
    pairs, species = solution.mixture.pairs, solution.mixture.species
    attraction = pairs.well_depth / solution.state.temperature
    g_r, gamma_r = np.empty((2, species, species, len(r)))
    for i, j in np.ndindex(species, species):
        whole = CubicSpline(np.append(0.0, solution.r), np.append(0.0, solution.r * solution.gamma_r[i, j]))
        gamma_r[i, j] = np.where(r <= solution.r[-1], whole(r), 0.0) / r
        core, edge = step(r, float(pairs.diameter[i, j])), step(r, float(pairs.well_edge[i, j]))
        inside = CLOSURES[closure](gamma_r[i, j], attraction[i, j])
        g_r[i, j] = (edge - core) * inside + (1.0 - edge) * CLOSURES[closure](gamma_r[i, j], 0.0)
    c_r = g_r - 1.0 - gamma_r
    c_k = forward(c_r, r, k)
    rho = solution.densities
    c = np.moveaxis(c_k, -1, 0)
    gamma_k = np.moveaxis(np.linalg.solve(np.eye(species) - c * rho, c) - c, 0, -1)  # h = c + c rho h
    return PlainResult(r, k, g_r, c_r + inverse(gamma_k, r, k), c_k, forward(g_r - 1.0, r, k))
