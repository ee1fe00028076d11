"""Closed forms to test against. They stand alone: no formula, array or grid is shared with the solver.

Units: lengths in any unit, densities in its inverse cube, transforms in its cube. Temperatures enter as
reduced depths beta eps. Virial coefficients B_n are in units of b0^(n-1), b0 = 2 pi sigma^3/3. s is the
number of species.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from ozsolve.errors import InputError

Vector = NDArray[np.float64]


def moments(rho: Vector, diameter: Vector) -> Vector:
    """xi_n = (pi/6) sum_i rho_i sigma_i^n, n = 0..3; xi_3 is the packing fraction.

    Parameters
    ----------
    rho, diameter : ndarray, shape (s,)
        Number densities (inverse cubed length) and diameters (length).

    Returns
    -------
    ndarray, shape (4,)

    Raises
    ------
    InputError
        If the packing fraction is not inside [0, 1).
    """
    xi = np.array([math.pi / 6.0 * float(np.sum(rho * diameter**n)) for n in range(4)])
    if not 0.0 <= xi[3] < 1.0:
        raise InputError("rho", np.asarray(rho).tolist(), f"the packing fraction {xi[3]:.4g} must lie in [0, 1)")
    return xi


def py_contact_values(rho: Vector, diameter: Vector) -> Vector:
    """g_ij(sigma_ij+) of additive hard spheres in the Percus-Yevick closure, dimensionless.

    1/D + 3 xi_2 m_ij/D^2 with D = 1 - xi_3, m_ij = sigma_i sigma_j/(sigma_i + sigma_j): Lebowitz,
    Phys. Rev. 133 (1964) A895. Arguments and `Raises` as in `moments`.

    Returns
    -------
    ndarray, shape (s, s)

    Examples
    --------
    >>> rho = np.array([0.3 * 6.0 / math.pi])  # one component: (1 + eta/2)/(1 - eta)^2
    >>> round(float(py_contact_values(rho, np.array([1.0]))[0, 0]), 6)
    2.346939
    """
    xi = moments(rho, diameter)
    free = 1.0 - xi[3]
    return np.asarray(1.0 / free + 3.0 * xi[2] / (1.0 / diameter[:, None] + 1.0 / diameter) / free**2)


def bmcsl_contact_values(rho: Vector, diameter: Vector) -> Vector:
    """g_ij(sigma_ij+) of additive hard spheres, close to exact, dimensionless, shape (s, s).

    Percus-Yevick plus 2 xi_2^2 m_ij^2/D^3: Boublik, J. Chem. Phys. 53 (1970) 471; Mansoori, Carnahan,
    Starling and Leland, J. Chem. Phys. 54 (1971) 1523. Arguments and `Raises` as in `moments`.
    """
    xi = moments(rho, diameter)
    extra = 2.0 * (xi[2] / (1.0 / diameter[:, None] + 1.0 / diameter)) ** 2 / (1.0 - xi[3]) ** 3
    return np.asarray(py_contact_values(rho, diameter) + extra)


def py_compressibility_pressure(rho: Vector, diameter: Vector) -> float:
    """beta P of the compressibility route, inverse cubed length: Lebowitz (1964).

    (6/pi) [xi_0/D + 3 xi_1 xi_2/D^2 + 3 xi_2^3/D^3]. Arguments and `Raises` as in `moments`.
    """
    xi = moments(rho, diameter)
    return _pressure(xi, 3.0 * xi[2] ** 3 / (1.0 - xi[3]) ** 3)


def py_virial_pressure(rho: Vector, diameter: Vector) -> float:
    """beta P of the virial route, inverse cubed length: Lebowitz (1964); last term 3 xi_2^3/D^2.

    Arguments and `Raises` as in `moments`.
    """
    xi = moments(rho, diameter)
    return _pressure(xi, 3.0 * xi[2] ** 3 / (1.0 - xi[3]) ** 2)


def bmcsl_pressure(rho: Vector, diameter: Vector) -> float:
    """beta P, inverse cubed length; last term xi_2^3 (3 - xi_3)/D^3.

    Boublik (1970), Mansoori et al. (1971). Arguments and `Raises` as in `moments`.

    Examples
    --------
    >>> rho = np.array([0.3 * 6.0 / math.pi])  # Carnahan and Starling: (1 + e + e^2 - e^3)/(1 - e)^3
    >>> round(bmcsl_pressure(rho, np.array([1.0])) / float(rho[0]), 6)
    3.973761
    """
    xi = moments(rho, diameter)
    return _pressure(xi, xi[2] ** 3 * (3.0 - xi[3]) / (1.0 - xi[3]) ** 3)


def _pressure(xi: Vector, last: float) -> float:
    free = 1.0 - xi[3]
    return float(6.0 / math.pi * (xi[0] / free + 3.0 * xi[1] * xi[2] / free**2 + last))


def py_inverse_compressibility(rho: Vector, diameter: Vector) -> float:
    """d(beta P)/d rho at constant composition, compressibility route; dimensionless.

    `py_compressibility_pressure` differentiated: every xi_n is proportional to rho. Arguments and
    `Raises` as in `moments`.

    Examples
    --------
    >>> rho = np.array([0.3 * 6.0 / math.pi])  # one component: (1 + 2 eta)^2/(1 - eta)^4
    >>> round(py_inverse_compressibility(rho, np.array([1.0])), 6)
    10.662224
    """
    xi = moments(rho, diameter)
    free = 1.0 - xi[3]
    terms = ((xi[0], 1), (3.0 * xi[1] * xi[2], 2), (3.0 * xi[2] ** 3, 3))
    slope = sum(n * term / free**n * (1.0 + xi[3] / free) for term, n in terms)
    return float(slope / xi[0])


def py_excess_free_energy(rho: Vector, diameter: Vector) -> float:
    """beta A_ex/V of the compressibility route, inverse cubed length.

    (6/pi) [-xi_0 ln D + 3 xi_1 xi_2/D + (3/2) xi_2^3/D^2]: the pressure of Lebowitz (1964), integrated;
    the form of scaled-particle theory, Lebowitz, Helfand and Praestgaard, J. Chem. Phys. 43 (1965) 774
    (memory). Its second derivatives are -c_ij(k = 0). Arguments and `Raises` as in `moments`.
    """
    xi = moments(rho, diameter)
    free = 1.0 - xi[3]
    reduced = -xi[0] * math.log(free) + 3.0 * xi[1] * xi[2] / free + 1.5 * xi[2] ** 3 / free**2
    return float(6.0 / math.pi * reduced)


def py_direct_correlation(r: Vector, eta: float) -> Vector:
    """c(r) of one-component hard spheres, sigma = 1, packing fraction eta; 0 outside. Shape of r.

    -[(1 + 2e)^2 - 6e (1 + e/2)^2 r + (e/2)(1 + 2e)^2 r^3]/(1 - e)^4: Wertheim, Phys. Rev. Lett. 10
    (1963) 321; Thiele, J. Chem. Phys. 39 (1963) 474.

    Raises
    ------
    InputError
        If eta is not inside [0, 1).
    """
    if not 0.0 <= eta < 1.0:
        raise InputError("eta", eta, "must lie in [0, 1)")
    plus, half = (1.0 + 2.0 * eta) ** 2, (1.0 + 0.5 * eta) ** 2
    inside = -(plus - 6.0 * eta * half * r + 0.5 * eta * plus * r**3) / (1.0 - eta) ** 4
    return np.where(r < 1.0, inside, 0.0)


def py_stability_matrix(k: Vector, rho: Vector, diameter: Vector) -> Vector:
    """delta_ij - sqrt(rho_i rho_j) c_ij(k) of additive Percus-Yevick hard spheres, dimensionless.

    Baxter's factor (Baxter, J. Chem. Phys. 52 (1970) 4559, coefficients of Lebowitz (1964); memory):
    Q_ij(r) = a_i (r^2 - s_ij^2)/2 + b_i (r - s_ij) for (s_i - s_j)/2 < r < s_ij = (s_i + s_j)/2, with
    a_i = 1/D + 3 xi_2 s_i/D^2, b_i = -3 xi_2 s_i^2/(2 D^2); Q_ij(k) = delta_ij - 2 pi sqrt(rho_i rho_j)
    int Q_ij e^(ikr) dr; the matrix is Q(k)^dagger Q(k). The integral is a Gauss sum, exact to round-off.

    Parameters
    ----------
    k : ndarray, shape (m,)
        Wave numbers, inverse length; 0 is allowed.
    rho, diameter : ndarray, shape (s,)

    Returns
    -------
    ndarray, shape (m, s, s)
        Its inverse is the matrix of partial structure factors. `Raises` as in `moments`.
    """
    xi = moments(rho, diameter)
    free = 1.0 - xi[3]
    a = 1.0 / free + 3.0 * xi[2] * diameter / free**2
    b = -1.5 * xi[2] * diameter**2 / free**2
    species = len(rho)
    count = 24 + math.ceil(float(np.max(np.abs(k), initial=0.0)) * float(diameter.max()))
    nodes, weights = np.polynomial.legendre.leggauss(count)
    factor = np.zeros((len(k), species, species), dtype=np.complex128)
    for i in range(species):
        for j in range(species):
            low, touch = 0.5 * (diameter[i] - diameter[j]), 0.5 * (diameter[i] + diameter[j])
            r = low + 0.5 * diameter[j] * (nodes + 1.0)
            q = 0.5 * a[i] * (r**2 - touch**2) + b[i] * (r - touch)
            integral = np.exp(1j * k[:, None] * r) @ (0.5 * diameter[j] * weights * q)
            factor[:, i, j] = float(i == j) - 2.0 * math.pi * math.sqrt(rho[i] * rho[j]) * integral
    return np.asarray(np.einsum("mli,mlj->mij", factor.conj(), factor).real)


def square_well_b2(well_range: float, reduced_depth: float) -> float:
    """B2/b0 = 1 - (lam^3 - 1)(exp(beta eps) - 1), exact: Hirschfelder, Curtiss and Bird (1954), chapter 3.

    Raises
    ------
    InputError
        If the range is not larger than 1.
    """
    _outside_core(well_range)
    return 1.0 - (well_range**3 - 1.0) * math.expm1(reduced_depth)


def square_well_b3(well_range: float, reduced_depth: float) -> float:
    """B3/b0^2 of the square well, range up to 2, exact: Kihara, Rev. Mod. Phys. 25 (1953) 831.

    Percus-Yevick and HNC give it too, by either route.

    Raises
    ------
    InputError
        If the range is not inside (1, 2].

    Examples
    --------
    >>> square_well_b3(1.5, 0.0)  # hard spheres
    0.625
    """
    l, x = _short(well_range), math.expm1(reduced_depth)
    first = l**6 - 18.0 * l**4 + 32.0 * l**3 - 15.0
    second = 2.0 * l**6 - 36.0 * l**4 + 32.0 * l**3 + 18.0 * l**2 - 16.0
    third = 6.0 * l**6 - 18.0 * l**4 + 18.0 * l**2 - 6.0
    return (5.0 - first * x - second * x**2 - third * x**3) / 8.0


def msa_b2_compressibility(well_range: float, reduced_depth: float) -> float:
    """B2/b0 of the mean spherical approximation, compressibility route: 1 - (lam^3 - 1) beta eps.

    Own derivation: minus half the integral of c at zero density. `Raises` as in `square_well_b2`.
    """
    _outside_core(well_range)
    return 1.0 - (well_range**3 - 1.0) * reduced_depth


def msa_b3_compressibility(well_range: float, reduced_depth: float) -> float:
    """B3/b0^2 of the mean spherical approximation, compressibility route, range up to 2.

    Own derivation, from c = beta eps in the well and g = 0 in the core expanded in density.

    Raises
    ------
    InputError
        If the range is not inside (1, 2].
    """
    l, b = _short(well_range), reduced_depth
    well = l**3 / 3.0 - 3.0 * l**2 / 16.0 + 1.0 / 96.0
    mixed = l**3 / 3.0 - 3.0 * l**4 / 16.0 + l**6 / 96.0
    return 4.0 * (b * b * well - 2.0 * b * (1.0 + b) * mixed + (1.0 + b) ** 2 * 5.0 / 32.0)


def _outside_core(well_range: float) -> None:
    if not well_range > 1.0:
        raise InputError("well_range", well_range, "must be larger than 1")


def _short(well_range: float) -> float:
    if not 1.0 < well_range <= 2.0:
        raise InputError("well_range", well_range, "the closed form here holds for ranges in (1, 2]")
    return well_range


def triple_overlap(a: float, b: float, c: float) -> float:
    """int int Theta(a - r_12) Theta(b - r_13) Theta(c - r_23) d3r_2 d3r_3, sixth power of the length.

    Kihara (1953); Hirschfelder, Curtiss and Bird (1954), chapter 3 (memory).

    Raises
    ------
    InputError
        If a radius is negative.

    Examples
    --------
    >>> b0 = 2.0 * math.pi / 3.0  # hard spheres: B3 = 5 b0^2/8 = one third of the integral
    >>> round(triple_overlap(1.0, 1.0, 1.0) / 3.0 / b0**2, 12)
    0.625
    """
    small, middle, large = sorted((a, b, c))
    if small < 0.0:
        raise InputError("radius", small, "must not be negative")
    if large >= small + middle:
        return (4.0 * math.pi / 3.0) ** 2 * (small * middle) ** 3
    a2, b2, c2 = a * a, b * b, c * c
    sixth = (a2**3 + b2**3 + c2**3) / 18.0
    fourth = (a2**2 * (b2 + c2) + b2**2 * (a2 + c2) + c2**2 * (a2 + b2)) / 2.0
    third = 8.0 / 9.0 * ((a * b) ** 3 + (b * c) ** 3 + (c * a) ** 3)
    return math.pi**2 * (sixth - fourth + third + a2 * b2 * c2)


def low_density_shells(
    core: Vector, edge: Vector, attraction: Vector, mean_spherical: bool = False
) -> tuple[Vector, Vector]:
    """Density expansion of 4 pi int g_ij r^2 dr over the well: K_ij + sum_k rho_k K_ijk + O(rho^2).

    g_ij = e^(B_ij) [1 + sum_k rho_k int f_ik f_kj] with Mayer functions f, exact and the same in
    Percus-Yevick and HNC; in the mean spherical approximation g_ij = 1 + B_ij + sum_k rho_k int c_ik
    c_kj with c = B in the well, -1 in the core. Both integrals are sums of `triple_overlap`.

    Parameters
    ----------
    core, edge, attraction : ndarray, shape (s, s)
        sigma_ij and lam_ij sigma_ij (length), beta eps_ij; symmetric.

    Returns
    -------
    zeroth : ndarray, shape (s, s)
        Cubed length.
    first : ndarray, shape (s, s, s)
        Last index k; sixth power of the length.

    Raises
    ------
    InputError
        If an edge does not lie outside its core.
    """
    if np.any(edge <= core):
        raise InputError("edge", np.asarray(edge).tolist(), "every well edge must lie outside its core")
    strength = attraction if mean_spherical else np.expm1(attraction)
    zeroth = 4.0 * math.pi / 3.0 * (edge**3 - core**3) * (1.0 + strength)
    species = len(core)
    first = np.zeros((species, species, species))
    for i, j, k in np.ndindex(species, species, species):
        near, far = (
            ((float(edge[p, k]), float(strength[p, k])), (float(core[p, k]), -1.0 - float(strength[p, k])))
            for p in (i, j)
        )
        outer, inner = float(edge[i, j]), float(core[i, j])
        first[i, j, k] = sum(
            c_a * c_b * (triple_overlap(outer, a, b) - triple_overlap(inner, a, b)) for a, c_a in near for b, c_b in far
        )
    if not mean_spherical:
        first *= np.exp(attraction)[:, :, None]
    return zeroth, first


def sticky_spheres(eta: float, tau: float) -> tuple[float, float, float]:
    """Sticky spheres in the Percus-Yevick closure: Baxter, J. Chem. Phys. 49 (1968) 2770.

    Parameters
    ----------
    eta : float
        Packing fraction.
    tau : float
        Stickiness parameter; smaller is stickier.

    Returns
    -------
    lam : float
        Smaller root of lam tau = (1 + eta/2)/(1 - eta)^2 - lam eta/(1 - eta) + lam^2 eta/12.
    bonded : float
        Mean number of touching neighbours, 2 eta lam.
    inverse_compressibility : float
        d(beta P)/d rho, compressibility route: (1 + 2 eta - mu)^2/(1 - eta)^4, mu = lam eta (1 - eta).

    Raises
    ------
    InputError
        If eta is not inside (0, 1), tau not positive, or there is no real root.
    """
    if not 0.0 < eta < 1.0:
        raise InputError("eta", eta, "must lie inside (0, 1)")
    if not tau > 0.0:
        raise InputError("tau", tau, "must be positive")
    linear = tau + eta / (1.0 - eta)
    constant = (1.0 + 0.5 * eta) / (1.0 - eta) ** 2
    square = linear**2 - eta * constant / 3.0
    if square < 0.0:
        raise InputError("tau", tau, "no real solution at this packing fraction")
    lam = 2.0 * constant / (linear + math.sqrt(square))
    mu = lam * eta * (1.0 - eta)
    return lam, 2.0 * eta * lam, (1.0 + 2.0 * eta - mu) ** 2 / (1.0 - eta) ** 4


def sticky_depth(well_range: float, tau: float) -> float:
    """beta eps of the square well whose second virial coefficient is that of stickiness tau.

    tau = 1/[4 (lam^3 - 1)(exp(beta eps) - 1)], from B2/b0 = 1 - 1/(4 tau): Baxter (1968).

    Raises
    ------
    InputError
        If the range is not larger than 1 or tau not positive.
    """
    _outside_core(well_range)
    if not tau > 0.0:
        raise InputError("tau", tau, "must be positive")
    return math.log1p(1.0 / (4.0 * tau * (well_range**3 - 1.0)))
