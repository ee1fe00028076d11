"""Additive hard-sphere mixtures (the reference of the energy route): pressure, Helmholtz energy, chemical
potentials.

Boublik, J. Chem. Phys. 53 (1970) 471; Mansoori, Carnahan, Starling and Leland, J. Chem. Phys. 54 (1971)
1523. One component: Carnahan and Starling, J. Chem. Phys. 51 (1969) 635. With xi_n = (pi/6) sum rho_i
sigma_i^n, y = xi_3 and q(y) = [ln(1 - y) + y/(1 - y)^2]/y^2,
    (pi/6) beta A_res/V = -xi_0 ln(1 - y) + 3 xi_1 xi_2/(1 - y) + xi_2^3 q(y)
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

SMALL_PACKING = 0.03
"""Below, q and its slope come from their series: the closed forms cancel to second and third order there."""
SERIES = np.arange(2, 24)


def bmcsl_compressibility_factor(rho: Array, diameter: Array) -> float:
    """Z of a hard-sphere mixture, Boublik-Mansoori-Carnahan-Starling-Leland.

    Source: Boublik, J. Chem. Phys. 53 (1970) 471; Mansoori, Carnahan, Starling and Leland, J. Chem.
    Phys. 54 (1971) 1523. One component: Carnahan and Starling, J. Chem. Phys. 51 (1969) 635.

    Parameters
    ----------
    rho : ndarray, shape (s,)
        Number densities, inverse cubed length unit.
    diameter : ndarray, shape (s,)
        Same length unit.
    """
    xi = _moments(rho, diameter)
    free = 1.0 - xi[3]
    pressure = xi[0] / free + 3.0 * xi[1] * xi[2] / free**2 + xi[2] ** 3 * (3.0 - xi[3]) / free**3
    return pressure / xi[0]


def bmcsl_helmholtz(rho: Array, diameter: Array) -> float:
    """Residual A/(N kT) of the same mixture; parameters as above.

    Examples
    --------
    Carnahan and Starling, eta = 0.4: eta (4 - 3 eta)/(1 - eta)^2.

    >>> round(bmcsl_helmholtz(np.array([2.4 / math.pi]), np.array([1.0])), 9) == round(0.4 * 2.8 / 0.36, 9)
    True
    """
    xi = _moments(rho, diameter)
    q, _ = _q(xi[3])
    free = 1.0 - xi[3]
    return (-xi[0] * math.log1p(-xi[3]) + 3.0 * xi[1] * xi[2] / free + xi[2] ** 3 * q) / xi[0]


def bmcsl_chemical_potentials(rho: Array, diameter: Array) -> Array:
    """Residual beta mu_i at constant volume, shape (s,): the derivative of beta A_res/V by rho_i.

    Species at zero density have one too. Parameters as above.
    """
    xi = _moments(rho, diameter)
    q, slope = _q(xi[3])
    free = 1.0 - xi[3]
    by_moment = (
        -math.log1p(-xi[3]),
        3.0 * xi[2] / free,
        3.0 * xi[1] / free + 3.0 * xi[2] ** 2 * q,
        xi[0] / free + 3.0 * xi[1] * xi[2] / free**2 + xi[2] ** 3 * slope,
    )
    return np.asarray(sum(term * diameter**n for n, term in enumerate(by_moment)))


def _moments(rho: Array, diameter: Array) -> list[float]:
    return [math.pi / 6.0 * float(np.sum(rho * diameter**n)) for n in range(4)]


def _q(y: float) -> tuple[float, float]:
    """q(y) = sum_{n >= 2} (n - 1/n) y^(n - 2), and its slope."""
    if y < SMALL_PACKING:
        terms = SERIES - 1.0 / SERIES
        powers = y ** (SERIES - 2.0)
        return float(terms @ powers), float((terms[1:] * (SERIES[1:] - 2.0)) @ powers[:-1])
    free = 1.0 - y
    bracket = math.log1p(-y) + y / free**2
    bracket_slope = -1.0 / free + (1.0 + y) / free**3
    return bracket / y**2, bracket_slope / y**2 - 2.0 * bracket / y**3
