"""States along beta from the hard-sphere mixture to the temperature asked, and integrals along them.

    beta A_attraction/N = int_0^beta (U/N) d beta',    beta mu_j,attraction = int_0^beta (dU/dN_j) d beta'
by the Gauss-Radau rule whose last point is beta itself (degree 2n - 2; Abramowitz and Stegun, Handbook
of Mathematical Functions (1964), 25.4.31), so that the wanted state is one of the points.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray
from scipy.special import roots_jacobi

from localcomp.energyroute import is_additive
from localcomp.errors import NoAnswer
from ozsolve import Mixture, Solution, State, solve_paths

Array = NDArray[np.float64]

BETA_POINTS = 6
"""Points on a path; `quadrature_error` watches whether they suffice."""

FINEST = 1e-10
ACCURACY_SHARE = 0.3
"""The states are solved to this share of the accuracy asked: ln gamma of a large species among small ones
multiplies the error of the energy by the ratio of volumes. Near order 5 in the spacing this costs little."""


@lru_cache(maxsize=8)
def radau(points: int) -> tuple[Array, Array]:
    """Nodes in (0, 1], the last one 1, and weights of the rule for int_0^1.

    Examples
    --------
    >>> nodes, weights = radau(3)
    >>> bool(abs(weights @ nodes**4 - 0.2) < 1e-14), float(nodes[-1])
    (True, 1.0)
    """
    inner, weights = roots_jacobi(points - 1, 1.0, 0.0)
    nodes = np.append(0.5 * (inner + 1.0), 1.0)
    scaled = np.append(0.5 * weights / (1.0 - inner), 1.0 / points**2)
    return nodes, scaled


@dataclass(frozen=True)
class BetaPath:
    """Solved states from near the hard-sphere mixture to one state.

    Attributes
    ----------
    mixture : Mixture
    state : State
        The end.
    solutions : tuple of Solution
        At the Radau points; the last one is the state's own.
    """

    mixture: Mixture
    state: State
    solutions: tuple[Solution, ...]

    @property
    def usable(self) -> bool:
        """Whether every state on the path has a solution."""
        return all(solution.status.usable for solution in self.solutions)

    @property
    def reason(self) -> str:
        """Why the path is unavailable; empty when it is not."""
        for solution in self.solutions:
            if not solution.status.usable:
                where = "the state itself" if solution is self.solutions[-1] else "its path in beta from hard spheres"
                return f"{where} has no solution at kT = {solution.state.temperature:.5g}: {solution.message}"
        return ""

    @property
    def end(self) -> Solution:
        """The state's own solution."""
        return self.solutions[-1]

    @property
    def energies(self) -> Array:
        """U/N over the end's kT along the path, shape (points,)."""
        return np.array([s.internal_energy for s in self.solutions]) / self.state.temperature

    @property
    def energy_errors(self) -> Array:
        """Error bars of them, shape (points,)."""
        bars = [float(s.errors.energy) * s.state.temperature for s in self.solutions]
        return np.array(bars) / self.state.temperature

    @property
    def helmholtz(self) -> float:
        """A_attraction/(N kT)."""
        return float(self._weights @ self.energies)

    @property
    def z_attraction(self) -> float:
        """Attraction part of Z: d[A_attraction/(N kT)]/d ln rho."""
        return float(self._weights @ [s.energy_density_slope for s in self.solutions]) / self.state.temperature

    @property
    def helmholtz_error(self) -> float:
        """Error bar of it: of the solved energies, all taken in one direction, and of the quadrature."""
        return float(self._weights @ self.energy_errors) + quadrature_error(self.energies)

    def chemical_potentials(self) -> Array:
        """Attraction part of beta mu_j at constant volume, shape (s,)."""
        rows = np.array([s.partial_energies for s in self.solutions]) / self.state.temperature
        return np.asarray(self._weights @ rows)

    @property
    def _weights(self) -> Array:
        return radau(len(self.solutions))[1]


def quadrature_error(values: Array) -> float:
    """Estimated error of the Radau rule for an integrand known at its points.

    The rule is exact up to degree 2n - 2; Legendre coefficients beyond are continued geometrically from
    the last ones of the interpolating polynomial.
    """
    nodes, _ = radau(len(values))
    coefficients = np.abs(np.polynomial.legendre.legfit(2.0 * nodes - 1.0, values, len(values) - 1))
    last = max(float(coefficients[-1]), 0.5 * float(coefficients[-2]))
    if last == 0.0:
        return 0.0
    before = max(float(coefficients[-3]), float(coefficients[-4]), last)
    ratio = min((last / before) ** 0.5, 1.0)
    return float(last * ratio ** (len(values) - 1))


def beta_paths(
    ends: Sequence[tuple[Mixture, State]], closure: str, accuracy: float, points: int = BETA_POINTS
) -> list[BetaPath]:
    """Solve the paths to all these states together.

    Raises
    ------
    NoAnswer
        If the diameters are not additive: the hard-sphere mixture has no closed form then.
    """
    for mixture, _ in ends:
        if not is_additive(mixture):
            raise NoAnswer("activity coefficients need additive diameters (l = 0): the hard-sphere part has no "
                           "closed form else")  # fmt: skip
    nodes, _ = radau(points)
    finer = max(ACCURACY_SHARE * accuracy, FINEST)
    found = solve_paths(ends, [float(node) for node in nodes], closure=closure, accuracy=finer)
    return [BetaPath(mixture, state, tuple(row)) for (mixture, state), row in zip(ends, found, strict=True)]
