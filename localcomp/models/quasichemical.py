"""Quasi-chemical theory: contact pairs in chemical equilibrium on a lattice of sites."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from localcomp.models.base import BOTH, COMPOSITION_DEPENDENT, Adjustable, Array, Claim, ModelInput, Parameter, Reading
from localcomp.models.combinatorial import staverman_guggenheim

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

    theta_i = q_i x_i/sum q x. The lattice z drops out of the ratio. The theory is about single contacts,
    m = 1; under the other reading m contacts are made or broken together and are z/m in number.
    """

    name: ClassVar[str] = "quasi-chemical"
    label: ClassVar[str] = "quasi-chemical"
    year: ClassVar[int] = 1952
    source: ClassVar[str] = "Guggenheim, Mixtures (Oxford, 1952), chapters 4 and 10"
    parameters: ClassVar[tuple[Parameter, ...]] = (
        Parameter("eps_ij - (eps_ii + eps_jj)/2", "J/mol or kT", "interchange energy of a contact, one per pair"),
        Parameter("q_i", "1", "surface of a molecule in segments"),
        Parameter("z", "1", "lattice coordination number"),
    )
    adjustable: ClassVar[Adjustable] = Adjustable.INTERCHANGE
    readings: ClassVar[tuple[Reading, ...]] = BOTH
    claims: ClassVar[frozenset[Claim]] = COMPOSITION_DEPENDENT

    def _factors(self, given: ModelInput, reading: Reading) -> tuple[Array, Array]:
        """g_i and E_ij; NaN where an exponent is beyond `LARGEST_EXPONENT`."""
        exponent = given.contacts(reading) * given.interchange
        far = np.max(np.abs(exponent), axis=(-2, -1)) > LARGEST_EXPONENT
        boltzmann = np.exp(np.where(far[..., None, None], 0.0, exponent))
        theta = given.surface * given.mole_fractions
        factor = contact_factors(theta / theta.sum(axis=-1, keepdims=True), boltzmann)
        return np.where(far[..., None], np.nan, factor), boltzmann

    def ratios(self, given: ModelInput, reading: Reading) -> Array:
        """R_ij = (q_j/q_i)(G_j/G_i) exp(D_ij), shape (..., s, s); NaN beyond `LARGEST_EXPONENT`."""
        factor, boltzmann = self._factors(given, reading)
        weight = given.surface * factor
        return np.asarray(weight[..., None, :] / weight[..., :, None] * boltzmann)

    def center_contacts(self, given: ModelInput) -> Array:
        """q_i."""
        return given.surface * np.ones_like(given.mole_fractions)

    def energy_contacts(self, given: ModelInput, reading: Reading) -> Array:
        """z/2 under either reading."""
        return Reading.ALL_CONTACTS.contacts(given.z)

    def residual(self, given: ModelInput, reading: Reading) -> Array:
        """(z/m) q_i ln(G_i/G_i,pure)."""
        factor, _ = self._factors(given, reading)
        z = np.asarray(given.z, float)
        return np.asarray((z / reading.contacts(z))[..., None] * given.surface * np.log(factor))

    def combinatorial(self, given: ModelInput) -> Array:
        """Staverman-Guggenheim."""
        return staverman_guggenheim(given.mole_fractions, given.volume, given.surface, given.z)


def contact_factors(theta: Array, boltzmann: Array) -> Array:
    """g_i = G_i exp(beta eps_ii/2), the solution of g_i sum_j theta_j g_j E_ij = 1.

    Newton steps in u = ln g. With P_ij = theta_j g_i g_j E_ij the equations are sum_j P_ij = 1 and
    their derivative by u is diag(sum_j P_ij) + P; for theta > 0 they are the stationary point of the
    convex function sum_ij theta_i theta_j g_i g_j E_ij/2 - sum_i theta_i u_i, so there is one solution.

    Parameters
    ----------
    theta : ndarray, shape (..., s)
        Surface fractions.
    boltzmann : ndarray, shape (..., s, s)
        E_ij = exp[beta (eps_ij - (eps_ii + eps_jj)/2)], 1 on the diagonal.

    Raises
    ------
    ArithmeticError
        If the steps do not settle (energies beyond `LARGEST_EXPONENT`).
    """
    shape = np.broadcast_shapes(theta.shape, boltzmann.shape[:-1])
    theta = np.broadcast_to(theta, shape)
    g = np.ones(shape, np.result_type(theta, boltzmann))
    unit = np.eye(shape[-1])
    for _ in range(MAX_STEPS):
        pairs = g[..., :, None] * boltzmann * (theta * g)[..., None, :]
        total = pairs.sum(axis=-1)
        move = np.linalg.solve(total[..., :, None] * unit + pairs, (1.0 - total)[..., None])[..., 0]
        largest = np.max(np.abs(move), axis=-1, keepdims=True)
        g = g * np.exp(move * np.minimum(1.0, LARGEST_MOVE / np.maximum(largest, TOLERANCE)))
        misfit = np.max(np.abs(1.0 - total), axis=-1, keepdims=True)
        if np.all((largest < TOLERANCE) | (misfit < ROUND_OFF)):
            return np.asarray(g)
    raise ArithmeticError(f"the quasi-chemical equations did not settle in {MAX_STEPS} steps")


OFFERED = (QuasiChemical(),)
