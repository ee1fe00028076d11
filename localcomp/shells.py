"""Shell rules: how far the first neighbour shell of each pair reaches."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar, Protocol

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline

from localcomp.errors import NoAnswer
from ozsolve import Solution

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


@dataclass(frozen=True)
class WellEdge:
    """The shell ends where the well ends: L_ij = lam_ij sigma_ij."""

    name: ClassVar[str] = "well_edge"
    description: ClassVar[str] = "well edge"

    def radius(self, solution: Solution) -> Array:
        return solution.mixture.pairs.well_edge


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


@dataclass(frozen=True)
class FirstMinimum:
    """The shell ends at the first minimum of g_ij(r) beyond contact.

    At a well edge g steps down by exp(beta eps); the edge itself is the minimum when g rises beyond
    it. The first minimum is a common choice for simple liquids (common practice, no source).
    """

    name: ClassVar[str] = "first_minimum"
    description: ClassVar[str] = "first minimum of g"

    def radius(self, solution: Solution) -> Array:
        size = solution.mixture.species
        out = np.empty((size, size))
        for i in range(size):
            for j in range(i, size):
                out[i, j] = out[j, i] = self._pair(solution, i, j)
        return out

    def _pair(self, solution: Solution, i: int, j: int) -> float:
        core = float(solution.mixture.pairs.diameter[i, j])
        edge = float(solution.mixture.pairs.well_edge[i, j])
        inner, outer = (float(table[i, j]) for table in solution.edge_values)
        reach = 4.0 * core
        found = _first_minimum(solution, i, j, core, edge, float(solution.contact_values[i, j]), inner)
        if found is not None:
            return found
        r, g = solution.r, solution.g_r[i, j]
        beyond = (r > edge) & (r < reach)
        radii = np.concatenate(([edge], r[beyond]))
        values = np.concatenate(([outer], g[beyond]))
        spline = CubicSpline(radii, values)
        if inner > outer and float(spline(edge, 1)) >= 0.0:
            return edge
        minimum = _smooth_minimum(spline, radii)
        if minimum is None:
            raise NoAnswer(
                f"g_{i + 1}{j + 1}(r) has no minimum between contact and {reach:.3g}: "
                "the first-minimum shell does not exist at this state; use another shell rule"
            )
        return minimum


def _first_minimum(
    solution: Solution, i: int, j: int, core: float, edge: float, contact: float, inner: float
) -> float | None:
    """A smooth minimum inside the well, if there is one."""
    r, g = solution.r, solution.g_r[i, j]
    inside = (r > core) & (r < edge)
    radii = np.concatenate(([core], r[inside], [edge]))
    values = np.concatenate(([contact], g[inside], [inner]))
    if len(radii) < 4:
        return None
    keep = np.concatenate(([True], np.diff(radii) > 1e-9 * core))
    return _smooth_minimum(CubicSpline(radii[keep], values[keep]), radii)


def _smooth_minimum(spline: CubicSpline, radii: Array) -> float | None:
    turning = spline.derivative().roots(extrapolate=False)
    for radius in np.sort(turning):
        if radii[0] < radius < radii[-1] and float(spline(radius, 2)) > 0.0:
            return float(radius)
    return None


RULES = (WellEdge.name, FirstMinimum.name, FixedMultiple.name)


def make_rule(name: str, multiple: float = 1.5) -> ShellRule:
    """The rule object for the word used in files."""
    if name == FixedMultiple.name:
        return FixedMultiple(multiple)
    return FirstMinimum() if name == FirstMinimum.name else WellEdge()
