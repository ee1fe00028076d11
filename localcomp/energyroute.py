"""Pressure by the energy route: hard spheres plus the density derivative of the attraction part.

    A_attraction/(N kT) = int_0^beta (U/N) d beta'
    Z = Z_hard-sphere + d[A_attraction/(N kT)]/d ln rho
The integral takes Gauss points in beta; at each the derivative of U/N by the density comes from
implicit differentiation of the solved state.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from localcomp.errors import NoAnswer
from localcomp.hardspheres import bmcsl_compressibility_factor
from ozsolve import Mixture, Solution, State, solve

GAUSS_POINTS = 6
"""Points in beta; the integrand is smooth and 8 points change Z by less than 1e-6 in trials."""
ADDITIVE_TOLERANCE = 1e-12


@dataclass(frozen=True)
class EnergyRoute:
    """Attraction part of the Helmholtz energy and the pressure of one state.

    Attributes
    ----------
    helmholtz_attraction : float
        A_attraction/(N kT).
    z_hard_sphere, z_attraction : float
        The two parts of Z.
    """

    helmholtz_attraction: float
    z_hard_sphere: float
    z_attraction: float

    @property
    def z(self) -> float:
        """Z = P/(rho kT) by the energy route."""
        return self.z_hard_sphere + self.z_attraction


def energy_route(
    mixture: Mixture, state: State, closure: str, accuracy: float = 1e-5, points: int = GAUSS_POINTS
) -> EnergyRoute:
    """Integrate the energy over beta from the hard-sphere mixture.

    Raises
    ------
    NoAnswer
        If the diameters are not additive (no closed form for the hard-sphere mixture then), or the
        path in beta meets a region without solution.
    """
    if not is_additive(mixture):
        raise NoAnswer(
            "the energy route needs additive diameters (l = 0): its hard-sphere part has no closed form else"
        )
    rho = mixture.densities(state)
    nodes, weights = np.polynomial.legendre.leggauss(points)
    helmholtz = slope = 0.0
    for node, weight in zip(0.5 * (nodes + 1.0), 0.5 * weights, strict=True):
        warm = replace(state, temperature=state.temperature / float(node))
        solution = solve(mixture, warm, closure=closure, accuracy=accuracy, on_failure="return")
        if not solution.status.usable:
            raise NoAnswer(f"the path in beta from hard spheres is not available: {solution.message}")
        helmholtz += weight * solution.internal_energy / state.temperature
        slope += weight * solution.energy_density_slope / state.temperature
    return EnergyRoute(float(helmholtz), bmcsl_compressibility_factor(rho, mixture.diameter), float(slope))


def is_additive(mixture: Mixture) -> bool:
    """Whether sigma_ij = (sigma_i + sigma_j)/2 for every pair."""
    mean = 0.5 * (mixture.diameter[:, None] + mixture.diameter[None, :])
    return bool(np.all(np.abs(mixture.pairs.diameter - mean) <= ADDITIVE_TOLERANCE * mean))


def route_disagreement(solution: Solution, route: EnergyRoute) -> float:
    """Z(virial) - Z(energy); NaN when either is missing."""
    return solution.virial_z - route.z if math.isfinite(solution.virial_z) else math.nan
