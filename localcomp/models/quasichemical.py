"""Quasi-chemical theory: contact pairs in chemical equilibrium on a lattice of sites."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from localcomp.models.base import Array, Reading, StatementInput

MAX_STEPS = 200
TOLERANCE = 1e-13
"""Of ln g."""
ROUND_OFF = 2e-15
"""Of the equations' residual: nothing better can be reached."""
LARGEST_MOVE = 1.0
"""Of ln g in one step."""
LARGEST_EXPONENT = 20.0
"""Of a contact's preference in kT; beyond it the equations are singular in floating-point numbers."""


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
        """R_ij = (q_j/q_i)(G_j/G_i) exp(D_ij), shape (s, s); NaN beyond `LARGEST_EXPONENT`."""
        surface = given.diameter**2
        half = 0.5 * np.diag(given.reduced_depth)
        exponent = reading.contacts * (given.reduced_depth - half[:, None] - half[None, :])
        if float(np.max(np.abs(exponent))) > LARGEST_EXPONENT:
            return np.full_like(exponent, np.nan)
        boltzmann = np.exp(exponent)
        theta = surface * given.mole_fractions
        factor = contact_factors(theta / theta.sum(), boltzmann)
        return np.asarray((surface * factor)[None, :] / (surface * factor)[:, None] * boltzmann)


def contact_factors(theta: Array, boltzmann: Array) -> Array:
    """g_i = G_i exp(beta eps_ii/2), the solution of g_i sum_j theta_j g_j E_ij = 1.

    Newton steps in u = ln g. With P_ij = theta_j g_i g_j E_ij the equations are sum_j P_ij = 1 and
    their derivative by u is diag(sum_j P_ij) + P; for theta > 0 they are the stationary point of the
    convex function sum_ij theta_i theta_j g_i g_j E_ij/2 - sum_i theta_i u_i, so there is one solution.

    Parameters
    ----------
    theta : ndarray, shape (s,)
        Surface fractions.
    boltzmann : ndarray, shape (s, s)
        E_ij = exp[beta (eps_ij - (eps_ii + eps_jj)/2)], 1 on the diagonal.

    Raises
    ------
    ArithmeticError
        If the steps do not settle (energies beyond `LARGEST_EXPONENT`).
    """
    g = np.ones_like(theta)
    for _ in range(MAX_STEPS):
        pairs = g[:, None] * boltzmann * (theta * g)[None, :]
        total = pairs.sum(axis=1)
        move = np.linalg.solve(np.diag(total) + pairs, 1.0 - total)
        largest = float(np.max(np.abs(move)))
        g = g * np.exp(move * min(1.0, LARGEST_MOVE / max(largest, TOLERANCE)))
        if largest < TOLERANCE or float(np.max(np.abs(1.0 - total))) < ROUND_OFF:
            return np.asarray(g)
    raise ArithmeticError(f"the quasi-chemical equations did not settle in {MAX_STEPS} steps")
