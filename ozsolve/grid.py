"""Matched r and k points, edge-corrected indicator weights, interpolation at edges.

Sampling a step on a grid costs an error of the order of the spacing. Here the step's indicator is
replaced by weights that integrate polynomials exactly up to the step: for an edge at
a = (m0 + theta) h the weights are 1 up to m0, 0 above, plus corrections delta_j on the nearest
`STENCIL` points with sum_j delta_j t_j^q = B_{q+1}(theta)/(q + 1), t_j = a/h - j, q = 0..STENCIL-1
(the regularised power sums, Apostol, Introduction to Analytic Number Theory (1976), section 12.12).
"""

from __future__ import annotations

import math
from functools import lru_cache

import numpy as np

from ozsolve.potential import Array, Indices

STENCIL = 6
"""Points corrected around an edge; more gained nothing in trials, the kinks of gamma set the limit."""
INTERPOLATION = 8
"""Points of the local polynomial that gives gamma at an edge."""
FILTER_STRENGTH = 12.0
FILTER_ORDER = 8
"""Exponential filter exp(-strength (k/k_max)^order), the usual cure for content near the Nyquist
wave number, which a sampled step gets wrong (Hesthaven, Gottlieb and Gottlieb, Spectral Methods for
Time-Dependent Problems (2007), chapter 9: the filter; strength and order by trial here)."""


class Grid:
    """r_m = m h and k_m = m pi/(n h), m = 1..n-1 (both ends are zeros of the sine transform).

    Parameters
    ----------
    spacing : float
        h, in the reduced length unit (smallest diameter).
    points : int
        n; the extent is n h.
    """

    def __init__(self, spacing: float, points: int) -> None:
        self.spacing = spacing
        self.points = points
        index = np.arange(1, points, dtype=np.float64)
        self.r = spacing * index
        self.k = math.pi / (points * spacing) * index
        self.filter = np.exp(-FILTER_STRENGTH * (index / points) ** FILTER_ORDER)

    @property
    def extent(self) -> float:
        """n h, the radius at which correlations are cut."""
        return self.spacing * self.points


@lru_cache(maxsize=1)
def _bernoulli() -> tuple[Array, ...]:
    """Coefficients (ascending) of the Bernoulli polynomials B_1 .. B_STENCIL."""
    numbers = [1.0]
    for m in range(1, STENCIL + 1):
        numbers.append(-sum(math.comb(m + 1, k) * numbers[k] for k in range(m)) / (m + 1))
    return tuple(
        np.array([math.comb(q, power) * numbers[q - power] for power in range(q + 1)]) for q in range(1, STENCIL + 1)
    )


def step_correction(theta: float, first: int) -> Array:
    """Corrections delta_j on the `STENCIL` points `first` .. relative to m0, for one edge.

    Raises
    ------
    numpy.linalg.LinAlgError
        Never in practice: the points are distinct, so the Vandermonde matrix is regular.
    """
    t = theta - np.arange(first, first + STENCIL)
    moments = [np.polynomial.polynomial.polyval(theta, b) / q for q, b in enumerate(_bernoulli(), start=1)]
    return np.linalg.solve(np.vander(t, STENCIL, increasing=True).T, np.array(moments))


@lru_cache(maxsize=4096)
def step_weights(edge: float, spacing: float, points: int) -> Array:
    """Weights w_m, m = 1..points-1, of the indicator of r < edge; shape (points - 1,), read-only."""
    position = edge / spacing
    m0 = math.floor(position)
    if m0 + STENCIL > points:
        raise ValueError("the edge lies outside the grid")
    weights = np.zeros(points)
    weights[: m0 + 1] = 1.0
    first = max(-(STENCIL // 2) + 1, -m0)
    weights[m0 + first : m0 + first + STENCIL] += step_correction(position - m0, first)
    weights = weights[1:]
    weights.setflags(write=False)
    return weights


@lru_cache(maxsize=4096)
def edge_interpolation(edge: float, spacing: float, points: int) -> tuple[int, Array]:
    """Start index (into m = 1..points-1) and Lagrange weights that give a smooth function at `edge`."""
    position = edge / spacing
    start = max(math.floor(position) - INTERPOLATION // 2 + 1, 1)
    nodes = np.arange(start, start + INTERPOLATION, dtype=np.float64)
    gaps = nodes[:, None] - nodes[None, :]
    np.fill_diagonal(gaps, 1.0)
    ratios = (position - nodes[None, :]) / gaps
    np.fill_diagonal(ratios, 1.0)
    weights = ratios.prod(axis=1)
    weights.setflags(write=False)
    return start - 1, weights


@lru_cache(maxsize=512)
def indicators(edges: tuple[float, ...], spacing: float, points: int) -> Array:
    """`step_weights` of several edges, shape (len(edges), points - 1), read-only."""
    weights = np.array([step_weights(edge, spacing, points) for edge in edges])
    weights.setflags(write=False)
    return weights


@lru_cache(maxsize=512)
def edge_stencils(edges: tuple[float, ...], spacing: float, points: int) -> tuple[Indices, Array]:
    """`edge_interpolation` of several edges: grid indices and weights, each (len(edges), INTERPOLATION)."""
    found = [edge_interpolation(edge, spacing, points) for edge in edges]
    index = np.array([start for start, _ in found])[:, None] + np.arange(INTERPOLATION)
    weights = np.array([row for _, row in found])
    for array in (index, weights):
        array.setflags(write=False)
    return index, weights


def good_size(minimum: int) -> int:
    """Smallest 2^a 3^b 5^c with a >= 2 that is at least `minimum`: a quick transform length."""
    best = 1 << max(2, (minimum - 1).bit_length())
    for three in (1, 3, 9, 27):
        for five in (1, 5, 25):
            size = three * five * 4
            while size < minimum:
                size *= 2
            best = min(best, size)
    return best
