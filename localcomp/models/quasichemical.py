"""Quasi-chemical theory: contact pairs in chemical equilibrium on a lattice of sites."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from localcomp.models.base import Array, Reading, StatementInput

MAX_STEPS = 500
TOLERANCE = 1e-14


@dataclass(frozen=True)
class QuasiChemical:
    """N_ij = z q_i theta_j G_i G_j exp(beta eps_ij) with sum_j theta_j G_i G_j exp(beta eps_ij) = 1.

    q_i goes with sigma_i^2, theta_i = q_i x_i/sum q x. The lattice z drops out of the ratio.
    """

    label: ClassVar[str] = "quasi-chemical"
    source: ClassVar[str] = "Guggenheim, Mixtures (Oxford, 1952), chapters 4 and 10"

    @property
    def readings(self) -> tuple[Reading, ...]:
        """The theory is about single contacts."""
        return (Reading(1.0, "m = 1"),)

    def ratios(self, given: StatementInput, reading: Reading) -> Array:
        """R_ij = (q_j/q_i)(G_j/G_i) exp(D_ij), shape (s, s)."""
        surface = given.diameter**2
        half = 0.5 * np.diag(given.reduced_depth)
        boltzmann = np.exp(reading.contacts * (given.reduced_depth - half[:, None] - half[None, :]))
        theta = surface * given.mole_fractions
        factor = contact_factors(theta / theta.sum(), boltzmann)
        return np.asarray((surface * factor)[None, :] / (surface * factor)[:, None] * boltzmann)


def contact_factors(theta: Array, boltzmann: Array) -> Array:
    """G_i exp(beta eps_ii/2), the solution of g_i sum_j theta_j g_j E_ij = 1.

    Parameters
    ----------
    theta : ndarray, shape (s,)
        Surface fractions.
    boltzmann : ndarray, shape (s, s)
        E_ij = exp[beta (eps_ij - (eps_ii + eps_jj)/2)], 1 on the diagonal.

    Raises
    ------
    ArithmeticError
        If the damped substitution does not settle (extreme energies).
    """
    g = np.ones_like(theta)
    for _ in range(MAX_STEPS):
        following = np.sqrt(g / (boltzmann @ (theta * g)))
        if float(np.max(np.abs(following / g - 1.0))) < TOLERANCE:
            return np.asarray(following)
        g = following
    raise ArithmeticError("the quasi-chemical equations did not settle in 500 steps")
