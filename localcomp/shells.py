"""Shell rules: how far the first neighbour shell of each pair reaches."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar, Protocol

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import BSpline, PPoly, make_interp_spline

from localcomp.errors import NoAnswer
from ozsolve import Mixture, Solution

Array = NDArray[np.float64]


class ShellRule(Protocol):
    """A rule that gives the shell radius of every pair."""

    @property
    def name(self) -> str:
        """The word used in files."""
        ...

    @property
    def description(self) -> str:
        """A few words for tables."""
        ...

    def radius(self, solution: Solution) -> Array:
        """L_ij, shape (s, s), in the solution's length unit."""
        ...

    def uncertainty(self, solution: Solution) -> Array:
        """Numerical error of L_ij, shape (s, s)."""
        ...


@dataclass(frozen=True)
class WellEdge:
    """The shell ends where the well ends: L_ij = lam_ij sigma_ij."""

    name: ClassVar[str] = "well_edge"
    description: ClassVar[str] = "well edge"

    def radius(self, solution: Solution) -> Array:
        return solution.mixture.pairs.well_edge

    def uncertainty(self, solution: Solution) -> Array:
        return np.zeros_like(solution.mixture.pairs.well_edge)


@dataclass(frozen=True)
class FixedMultiple:
    """L_ij = multiple * sigma_ij.

    Attributes
    ----------
    multiple : float
        Larger than 1.
    """

    multiple: float = 1.5
    name: ClassVar[str] = "multiple"

    @property
    def description(self) -> str:
        """A few words for tables."""
        return f"{self.multiple:g} sigma_ij"

    def radius(self, solution: Solution) -> Array:
        return self.multiple * solution.mixture.pairs.diameter

    def uncertainty(self, solution: Solution) -> Array:
        return np.zeros_like(solution.mixture.pairs.diameter)


@dataclass(frozen=True)
class FirstMinimum:
    """The shell ends at the first minimum of g_ij(r) beyond contact.

    At a well edge g steps down by exp(beta eps); the edge itself is the minimum when g rises beyond
    it. The first minimum is a common choice for simple liquids (common practice, no source).
    """

    name: ClassVar[str] = "first_minimum"
    description: ClassVar[str] = "first minimum of g"

    def radius(self, solution: Solution) -> Array:
        return self._table(solution, rough=False)

    def uncertainty(self, solution: Solution) -> Array:
        """Error of the slope of g between the two grids, near the minimum, over its curvature there.

        The two minima themselves may agree by accident. Never more than `WINDOW` grid steps.
        """
        fine = self.radius(solution)
        out = np.zeros_like(fine)
        curves = [solution.g_segments(rough=rough) for rough in (False, True)]
        step = float(curves[1][0][1] - curves[1][0][0])
        size = solution.mixture.species
        for i in range(size):
            for j in range(i, size):
                core = float(solution.mixture.pairs.diameter[i, j])
                edge, limit = float(solution.mixture.pairs.well_edge[i, j]), float(fine[i, j])
                if limit == edge:
                    continue
                side, low, high = (1, core, edge) if limit < edge else (2, edge, REACH * core)
                slopes = [_spline(curve[0], curve[side][i, j], low, high).derivative() for curve in curves]
                near = np.linspace(max(low, limit - WINDOW * step), min(high, limit + WINDOW * step), 4 * WINDOW + 1)
                gap = float(np.max(np.abs(slopes[0](near) - slopes[1](near))))
                curvature = max(float(slopes[0](limit, 1)), 1e-300)
                out[i, j] = out[j, i] = min(gap / curvature, WINDOW * step)
        return out

    def _table(self, solution: Solution, *, rough: bool) -> Array:
        r, inside, beyond = solution.g_segments(rough=rough)
        size = solution.mixture.species
        out = np.empty((size, size))
        for i in range(size):
            for j in range(i, size):
                core = float(solution.mixture.pairs.diameter[i, j])
                edge = float(solution.mixture.pairs.well_edge[i, j])
                found = _first_minimum(r, inside[i, j], beyond[i, j], core, edge)
                if found is None:
                    raise NoAnswer(
                        f"g_{i + 1}{j + 1}(r) has no minimum between contact and {REACH * core:.3g}: "
                        "the first-minimum shell does not exist at this state; use another shell rule"
                    )
                out[i, j] = out[j, i] = found
        return out


REACH = 4.0
"""Minima are looked for up to here, in pair diameters."""
WINDOW = 3
"""Coarse grid steps about a minimum in which the error of the slope is read."""
MARGIN = 6
"""Grid points by which a spline reaches beyond the radii it is used for."""


def _first_minimum(r: Array, inside: Array, beyond: Array, core: float, edge: float) -> float | None:
    """The smallest radius beyond contact where g has a minimum, the well edge included.

    Each side of the edge is smooth and is taken from its own continuation, so that a spline of fifth
    degree holds up to the edge.
    """
    found = _smooth_minimum(r, inside, core, edge)
    if found is not None:
        return found
    spline = _spline(r, beyond, edge, REACH * core)
    steps_down = float(_spline(r, inside, core, edge)(edge)) > float(spline(edge))
    if steps_down and float(spline(edge, 1)) >= 0.0:
        return edge
    return _smooth_minimum(r, beyond, edge, REACH * core)


def _spline(r: Array, values: Array, low: float, high: float) -> BSpline:
    first = max(int(np.searchsorted(r, low)) - MARGIN, 0)
    last = int(np.searchsorted(r, high)) + MARGIN
    return make_interp_spline(r[first:last], values[first:last], k=5)


def _smooth_minimum(r: Array, values: Array, low: float, high: float) -> float | None:
    spline = _spline(r, values, low, high)
    slope = spline.derivative()
    for radius in np.sort(PPoly.from_spline(slope).roots(extrapolate=False)):
        if low < radius < high and float(slope(radius, 1)) > 0.0:
            return float(radius)
    return None


def informative_multiple(mixture: Mixture, multiple: float = 1.5) -> FixedMultiple:
    """A fixed multiple that does not repeat the well edge: `OTHER_MULTIPLE` where every well ends at `multiple`."""
    repeats = np.allclose(mixture.pairs.well_range, multiple, rtol=1e-9)
    return FixedMultiple(OTHER_MULTIPLE if repeats else multiple)


OTHER_MULTIPLE = 1.35
RULES = (WellEdge.name, FirstMinimum.name, FixedMultiple.name)


def make_rule(name: str, multiple: float = 1.5) -> ShellRule:
    """The rule object for the word used in files."""
    if name == FixedMultiple.name:
        return FixedMultiple(multiple)
    return FirstMinimum() if name == FirstMinimum.name else WellEdge()
