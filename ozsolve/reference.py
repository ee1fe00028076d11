"""Closed forms to test against; they share no code with the solver.

Units: lengths in any unit, densities in its inverse cube; temperatures enter as reduced depths
beta eps. B_n are in units of b0^(n-1), b0 = 2 pi sigma^3/3.
"""

from __future__ import annotations

import math

import numpy as np

from ozsolve.errors import InputError
from ozsolve.potential import Array


def moments(rho: Array, diameter: Array) -> Array:
    """xi_n = (pi/6) sum rho_i sigma_i^n, n = 0..3, shape (4,)."""
    return np.array([math.pi / 6.0 * float(np.sum(rho * diameter**n)) for n in range(4)])


def py_contact_values(rho: Array, diameter: Array) -> Array:
    """g_ij(sigma_ij+) of additive hard spheres in the Percus-Yevick closure, shape (s, s).

    Lebowitz, Phys. Rev. 133 (1964) A895: 1/D + 3 xi_2 m_ij/D^2, m_ij = sigma_i sigma_j/(sigma_i + sigma_j).
    """
    xi = moments(rho, diameter)
    free = 1.0 - xi[3]
    mean = diameter[:, None] * diameter[None, :] / (diameter[:, None] + diameter[None, :])
    return np.asarray(1.0 / free + 3.0 * xi[2] * mean / free**2)


def py_compressibility_pressure(rho: Array, diameter: Array) -> float:
    """beta P of the compressibility route (Lebowitz 1964), inverse cubed length unit."""
    xi = moments(rho, diameter)
    free = 1.0 - xi[3]
    reduced = xi[0] / free + 3.0 * xi[1] * xi[2] / free**2 + 3.0 * xi[2] ** 3 / free**3
    return float(6.0 / math.pi * reduced)


def py_virial_pressure(rho: Array, diameter: Array) -> float:
    """beta P of the virial route (Lebowitz 1964), inverse cubed length unit."""
    xi = moments(rho, diameter)
    free = 1.0 - xi[3]
    reduced = xi[0] / free + 3.0 * xi[1] * xi[2] / free**2 + 3.0 * xi[2] ** 3 / free**2
    return float(6.0 / math.pi * reduced)


def py_direct_correlation(r: Array, eta: float) -> Array:
    """c(r) of one-component hard spheres, sigma = 1; 0 outside.

    Wertheim, Phys. Rev. Lett. 10 (1963) 321; Thiele, J. Chem. Phys. 39 (1963) 474.
    """
    plus, half = (1.0 + 2.0 * eta) ** 2, (1.0 + 0.5 * eta) ** 2
    inside = -(plus - 6.0 * eta * half * r + 0.5 * eta * plus * r**3) / (1.0 - eta) ** 4
    return np.where(r < 1.0, inside, 0.0)


def square_well_b2(well_range: float, reduced_depth: float) -> float:
    """B2/b0 = 1 - (lam^3 - 1)(exp(beta eps) - 1)."""
    return 1.0 - (well_range**3 - 1.0) * math.expm1(reduced_depth)


def square_well_b3(well_range: float, reduced_depth: float) -> float:
    """B3/b0^2 of the square well, range up to 2 (Kihara, Rev. Mod. Phys. 25 (1953) 831).

    Raises
    ------
    InputError
        If the range exceeds 2.
    """
    if not 1.0 < well_range <= 2.0:
        raise InputError("well_range", well_range, "the closed form here holds for ranges in (1, 2]")
    l, x = well_range, math.expm1(reduced_depth)
    first = l**6 - 18.0 * l**4 + 32.0 * l**3 - 15.0
    second = 2.0 * l**6 - 36.0 * l**4 + 32.0 * l**3 + 18.0 * l**2 - 16.0
    third = 6.0 * l**6 - 18.0 * l**4 + 18.0 * l**2 - 6.0
    return (5.0 - first * x - second * x**2 - third * x**3) / 8.0


def msa_b3_compressibility(well_range: float, reduced_depth: float) -> float:
    """B3/b0^2 of the mean spherical approximation, compressibility route, range up to 2.

    From the closure c = beta eps in the well and g = 0 in the core, expanded in density.
    """
    l, b = well_range, reduced_depth
    well = l**3 / 3.0 - 3.0 * l**2 / 16.0 + 1.0 / 96.0
    mixed = l**3 / 3.0 - 3.0 * l**4 / 16.0 + l**6 / 96.0
    return 4.0 * (b * b * well - 2.0 * b * (1.0 + b) * mixed + (1.0 + b) ** 2 * 5.0 / 32.0)


def sticky_spheres(eta: float, tau: float) -> tuple[float, float, float]:
    """Baxter's sticky spheres in the Percus-Yevick closure (J. Chem. Phys. 49 (1968) 2770).

    Returns
    -------
    lam : float
        Smaller root of lam tau = (1 + eta/2)/(1 - eta)^2 - lam eta/(1 - eta) + lam^2 eta/12.
    bonded : float
        Mean number of touching neighbours, 2 eta lam.
    inverse_compressibility : float
        d(beta P)/d rho, compressibility route.

    Raises
    ------
    InputError
        If there is no real root.
    """
    linear = tau + eta / (1.0 - eta)
    constant = (1.0 + 0.5 * eta) / (1.0 - eta) ** 2
    square = linear**2 - eta * constant / 3.0
    if square < 0.0:
        raise InputError("tau", tau, "no real solution at this packing fraction")
    lam = 6.0 / eta * (linear - math.sqrt(square))
    mu = lam * eta * (1.0 - eta)
    return lam, 2.0 * eta * lam, (1.0 + 2.0 * eta - mu) ** 2 / (1.0 - eta) ** 4


def sticky_depth(well_range: float, tau: float) -> float:
    """beta eps of the square well with the second virial coefficient of stickiness tau:
    tau = 1/[4 (lam^3 - 1)(exp(beta eps) - 1)]."""
    return math.log1p(1.0 / (4.0 * tau * (well_range**3 - 1.0)))
