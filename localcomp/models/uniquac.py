"""UNIQUAC: R_ij = (q_j/q_i) exp(m D_ij)."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from localcomp.models.base import EVERY_CLAIM, Adjustable, Array, Claim, ModelInput, Parameter, Reading
from localcomp.models.combinatorial import staverman_guggenheim
from localcomp.models.twoliquid import local_logarithm


def uniquac_residual(mole_fractions: Array, surface: Array, tau: Array) -> Array:
    """q_i [1 - ln s_i - sum_j theta_j tau_ij/s_j], s_i = sum_j theta_j tau_ji.

    Parameters
    ----------
    mole_fractions, surface : ndarray, shape (..., s)
    tau : ndarray, shape (..., s, s)
        tau_ij = exp[-(u_ij - u_jj)/RT]; the second index is the centre, as in the source.

    Notes
    -----
    Abrams and Prausnitz, AIChE J. 21 (1975) 116.
    """
    theta = mole_fractions * surface
    theta = theta / theta.sum(axis=-1, keepdims=True)
    return np.asarray(surface * local_logarithm(theta, np.swapaxes(tau, -1, -2)))


@dataclass(frozen=True)
class Uniquac:
    """Local surface fractions theta_ij/theta_ii = (theta_j/theta_i) exp[m beta (eps_ij - eps_ii)].

    By its derivation the parameter is the energy of all z/2 contacts of a segment.
    """

    name: ClassVar[str] = "uniquac"
    label: ClassVar[str] = "UNIQUAC"
    year: ClassVar[int] = 1975
    source: ClassVar[str] = "Abrams and Prausnitz, AIChE J. 21 (1975) 116"
    parameters: ClassVar[tuple[Parameter, ...]] = (
        Parameter("u_ij - u_jj", "J/mol or kT", "-m (eps_ij - eps_jj), two per pair"),
        Parameter("r_i, q_i", "1", "volume and surface of a molecule in segments"),
        Parameter("z", "1", "lattice coordination number, in the combinatorial part"),
    )
    adjustable: ClassVar[Adjustable] = Adjustable.EXCHANGE
    readings: ClassVar[tuple[Reading, ...]] = (Reading.ALL_CONTACTS, Reading.ONE_CONTACT)
    claims: ClassVar[frozenset[Claim]] = EVERY_CLAIM

    def ratios(self, given: ModelInput, reading: Reading) -> Array:
        """(q_j/q_i) exp(m D_ij)."""
        return surface_ratios(given, reading)

    def center_contacts(self, given: ModelInput) -> Array:
        """q_i."""
        return given.surface * np.ones_like(given.mole_fractions)

    def energy_contacts(self, given: ModelInput, reading: Reading) -> Array:
        """m: the parameter is the energy of m contacts."""
        return reading.contacts(given.z)

    def residual(self, given: ModelInput, reading: Reading) -> Array:
        """q_i [1 - ln s_i - sum_j theta_j tau_ij/s_j]."""
        tau = np.exp(np.swapaxes(given.contacts(reading) * given.exchange, -1, -2))
        return uniquac_residual(given.mole_fractions, given.surface, tau)

    def combinatorial(self, given: ModelInput) -> Array:
        """Staverman-Guggenheim."""
        return staverman_guggenheim(given.mole_fractions, given.volume, given.surface, given.z)


def surface_ratios(given: ModelInput, reading: Reading) -> Array:
    """(q_j/q_i) exp(m D_ij), shape (..., s, s)."""
    surface = given.surface
    by_size = surface[..., None, :] / surface[..., :, None]
    return np.asarray(by_size * np.exp(given.contacts(reading) * given.exchange))


OFFERED = (Uniquac(),)
