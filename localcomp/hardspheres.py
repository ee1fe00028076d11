"""Pressure of the additive hard-sphere mixture (the reference of the energy route)."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


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
    xi = [math.pi / 6.0 * float(np.sum(rho * diameter**n)) for n in range(4)]
    free = 1.0 - xi[3]
    pressure = xi[0] / free + 3.0 * xi[1] * xi[2] / free**2 + xi[2] ** 3 * (3.0 - xi[3]) / free**3
    return pressure / xi[0]
