"""NRTL: R_ij = exp(alpha m D_ij)."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from localcomp.models.base import BOTH, EVERY_CLAIM, Adjustable, Array, Claim, ModelInput, Parameter, Reading


def nrtl_ln_gamma(mole_fractions: Array, tau: Array, alpha: Array | float) -> Array:
    """ln gamma_i = C_i/S_i + sum_j (x_j G_ij/S_j)(tau_ij - C_j/S_j), S_j = sum_k G_kj x_k, C_j = sum_k tau_kj G_kj x_k.

    Parameters
    ----------
    mole_fractions : ndarray, shape (..., s)
    tau : ndarray, shape (..., s, s)
        tau_ij = (g_ij - g_jj)/RT, 0 on the diagonal; the second index is the centre, as in the source.
    alpha : float or ndarray, shape (..., s, s)
        Nonrandomness; G_ij = exp(-alpha_ij tau_ij).

    Notes
    -----
    Renon and Prausnitz, AIChE J. 14 (1968) 135.
    """
    weight = np.exp(-alpha * tau) * mole_fractions[..., :, None]
    total = weight.sum(axis=-2)
    mean = (tau * weight).sum(axis=-2) / total
    share = np.exp(-alpha * tau) * (mole_fractions / total)[..., None, :]
    return np.asarray(mean + (share * (tau - mean[..., None, :])).sum(axis=-1))


@dataclass(frozen=True)
class Nrtl:
    """Wilson's ratio with the nonrandomness parameter alpha in the exponent.

    Attributes
    ----------
    alpha : float
        Nonrandomness, dimensionless; 0.2, 0.3 and 0.47 are the usual choices.
    """

    alpha: float = 0.3
    year: ClassVar[int] = 1968
    source: ClassVar[str] = "Renon and Prausnitz, AIChE J. 14 (1968) 135"
    parameters: ClassVar[tuple[Parameter, ...]] = (
        Parameter("g_ij - g_jj", "J/mol or kT", "-m (eps_ij - eps_jj), two per pair"),
        Parameter("alpha_ij", "1", "nonrandomness, one per pair"),
    )
    adjustable: ClassVar[Adjustable] = Adjustable.EXCHANGE
    readings: ClassVar[tuple[Reading, ...]] = BOTH
    claims: ClassVar[frozenset[Claim]] = EVERY_CLAIM

    @property
    def name(self) -> str:
        """The word used in files."""
        return f"nrtl-{self.alpha:g}"

    @property
    def label(self) -> str:
        """Name with alpha."""
        return f"NRTL (alpha = {self.alpha:g})"

    def ratios(self, given: ModelInput, reading: Reading) -> Array:
        """exp(alpha m D_ij)."""
        return np.asarray(np.exp(self.alpha * given.contacts(reading) * given.exchange))

    def center_contacts(self, given: ModelInput) -> Array:
        """The same for all molecules."""
        return np.ones_like(given.mole_fractions)

    def energy_contacts(self, given: ModelInput, reading: Reading) -> Array:
        """m: the parameter is the energy of m contacts."""
        return reading.contacts(given.z)

    def residual(self, given: ModelInput, reading: Reading) -> Array:
        """All of ln gamma_i."""
        tau = -np.swapaxes(given.contacts(reading) * given.exchange, -1, -2)
        return nrtl_ln_gamma(given.mole_fractions, tau, self.alpha)

    def combinatorial(self, given: ModelInput) -> Array:
        """None: the model has no size."""
        return np.zeros_like(given.mole_fractions)


OFFERED = (Nrtl(0.2), Nrtl(0.3), Nrtl(0.47))
