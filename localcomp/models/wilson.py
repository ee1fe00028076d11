"""Wilson: R_ij = exp(m D_ij)."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from localcomp.models.base import BOTH, EVERY_CLAIM, Adjustable, Array, Claim, ModelInput, Parameter, Reading
from localcomp.models.combinatorial import flory_huggins
from localcomp.models.twoliquid import local_logarithm


def wilson_ln_gamma(mole_fractions: Array, factors: Array) -> Array:
    """ln gamma_i = 1 - ln S_i - sum_k x_k Lambda_ki/S_k, S_i = sum_j x_j Lambda_ij (Wilson 1964).

    Parameters
    ----------
    mole_fractions : ndarray, shape (..., s)
    factors : ndarray, shape (..., s, s)
        Lambda_ij, 1 on the diagonal.
    """
    return local_logarithm(mole_fractions, factors)


@dataclass(frozen=True)
class Wilson:
    """Local mole fractions X_ij/X_ii = (x_j/x_i) exp[m beta (eps_ij - eps_ii)].

    The excess function is Flory and Huggins' with local volume fractions: Lambda_ij = (v_j/v_i) exp(m D_ij).
    Its value without attraction is the combinatorial part here, the rest the residual part.
    """

    name: ClassVar[str] = "wilson"
    label: ClassVar[str] = "Wilson"
    year: ClassVar[int] = 1964
    source: ClassVar[str] = "Wilson, J. Am. Chem. Soc. 86 (1964) 127"
    parameters: ClassVar[tuple[Parameter, ...]] = (
        Parameter("lambda_ij - lambda_ii", "J/mol or kT", "-m (eps_ij - eps_ii), two per pair"),
        Parameter("v_i", "cm3/mol or sigma^3", "molar volume"),
    )
    adjustable: ClassVar[Adjustable] = Adjustable.EXCHANGE
    readings: ClassVar[tuple[Reading, ...]] = BOTH
    claims: ClassVar[frozenset[Claim]] = EVERY_CLAIM

    def ratios(self, given: ModelInput, reading: Reading) -> Array:
        """exp(m D_ij)."""
        return np.asarray(np.exp(given.contacts(reading) * given.exchange))

    def center_contacts(self, given: ModelInput) -> Array:
        """The same for all molecules."""
        return np.ones_like(given.mole_fractions)

    def energy_contacts(self, given: ModelInput, reading: Reading) -> Array:
        """m: the parameter is the energy of m contacts."""
        return reading.contacts(given.z)

    def residual(self, given: ModelInput, reading: Reading) -> Array:
        """ln gamma_i without its athermal part."""
        volume = given.volume
        factors = volume[..., None, :] / volume[..., :, None] * self.ratios(given, reading)
        return np.asarray(wilson_ln_gamma(given.mole_fractions, factors) - self.combinatorial(given))

    def combinatorial(self, given: ModelInput) -> Array:
        """Flory-Huggins."""
        return flory_huggins(given.mole_fractions, given.volume)


OFFERED = (Wilson(),)
