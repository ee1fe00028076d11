"""ln gamma by the Kirkwood-Buff route: from the k = 0 limits of the direct correlation functions.

    d(beta mu_i)/d rho_j = delta_ij/rho_i - c_ij(0),    d(beta P) = sum_i rho_i d(beta mu_i)
Kirkwood and Buff, J. Chem. Phys. 19 (1951) 774, eqs. 11 to 20, in terms of c (Pearson and Rushbrooke, Proc. R.
Soc. Edinburgh A 64 (1957) 305; from memory). Integrated along a path of compositions; 1/rho_i
cancels against the ideal mixture, so that ends at infinite dilution are regular.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from localcomp.activity_parts import Array, densities, mole_fractions_of, volume_fractions
from localcomp.chebyshev import Interpolant, chebyshev_points
from ozsolve import Mixture, Solution, State, solve_many

RAY_DEGREE = 8


def packing_slope(solution: Solution, direction: Array) -> Array:
    """d ln gamma_i/ds at constant packing fraction, shape (s,).

    Parameters
    ----------
    direction : ndarray, shape (s,)
        d phi/ds, sums to zero.
    """
    volume = math.pi / 6.0 * solution.mixture.diameter**3
    rho = solution.densities
    eta = float(rho @ volume)
    change = eta * direction / volume
    response = solution.direct_correlation_integrals @ change
    excess_pressure = float(change.sum()) - float(rho @ response)
    total = float(rho.sum())
    return np.asarray(float(change.sum()) / total - response - volume / eta * excess_pressure)


def pressure_slope(solution: Solution, direction: Array) -> Array:
    """d ln gamma_i/ds at constant pressure, shape (s,); the volume follows from the same k = 0 limits.

    Parameters
    ----------
    direction : ndarray, shape (s,)
        dx/ds, sums to zero.
    """
    rho = solution.densities
    total = float(rho.sum())
    x = rho / total
    # d(beta P) = sum_j w_j d rho_j = 0 with w_j = 1 - sum_k rho_k c_kj and d rho = rho dx + x d(rho)
    weight = 1.0 - rho @ solution.direct_correlation_integrals
    growth = -total * float(weight @ direction) / float(weight @ x)
    change = total * direction + x * growth
    return np.asarray(growth / total - solution.direct_correlation_integrals @ change)


def isotherm_ln_gamma(mixture: Mixture, ends: Sequence[Solution], eta: float, s: Array) -> Array:
    """ln gamma of two species at volume fractions s of the first, shape (m, 2).

    Parameters
    ----------
    ends : sequence of Solution
        At Chebyshev points of the volume fraction, packing fraction eta.
    """
    slopes = Interpolant(np.array([packing_slope(end, np.array([1.0, -1.0])) for end in ends]))
    return _from_pures(slopes, s)


def _from_pures(slopes: Interpolant, s: Array) -> Array:
    """Integrals from each pure liquid (s = 1 for the first, 0 for the second) to s, shape (m, 2)."""
    values = slopes.integral(s)
    values[:, 0] -= slopes.integral(np.array([1.0]))[0, 0]
    return values


def ray_ln_gamma(mixture: Mixture, state: State, end: Solution, closure: str, accuracy: float) -> Array:
    """ln gamma of any number of species, shape (s,): integrals along straight lines in volume fraction
    from the composition to each pure liquid, at constant packing fraction. NaN where a line is interrupted.

    Parameters
    ----------
    end : Solution
        Of the state itself.
    """
    size = mixture.species
    phi = volume_fractions(mixture.diameter, np.array([state.mole_fractions]))[0]
    points = chebyshev_points(RAY_DEGREE)
    cases = []
    for corner in np.eye(size):
        for t in points[1:]:
            x = mole_fractions_of(mixture.diameter, ((1.0 - t) * phi + t * corner)[None])[0]
            rho = float(densities(mixture.diameter, x, mixture.packing_fraction(state)).sum())
            cases.append((mixture, State(state.temperature, tuple(x / x.sum()), density=rho)))
    found = solve_many(cases, closure=closure, accuracy=accuracy)
    out = np.full(size, math.nan)
    for i, corner in enumerate(np.eye(size)):
        line = [end, *found[i * RAY_DEGREE : (i + 1) * RAY_DEGREE]]
        if all(solution.status.usable for solution in line):
            slopes = Interpolant(np.array([packing_slope(solution, corner - phi)[i] for solution in line]))
            out[i] = -float(slopes.integral(np.array([1.0]))[0])
    return out
