"""Quasi-chemical theory expanded to first order in the interchange energies."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from localcomp.models.base import BOTH, COMPOSITION_DEPENDENT, Adjustable, Array, Claim, ModelInput, Parameter, Reading
from localcomp.models.combinatorial import staverman_guggenheim


@dataclass(frozen=True)
class FirstOrderQuasiChemical:
    """N_ij = z q_i theta_j (1 + d_i + d_j + m w_ij) with d_i = m [W/2 - sum_j theta_j w_ij].

    W = sum_ij theta_i theta_j w_ij.
    The excess function is the integral over beta of the energy of these neighbours,
    -(z/2) sum x q [W + (m/2)(W^2 - 2 sum_i theta_i (w theta)_i^2 + sum_ij theta_i theta_j w_ij^2)]; for two
    equal sizes that is w x1 x2 (1 - x1 x2 w/z) with the interchange energy w of the source.
    """

    name: ClassVar[str] = "quasi-chemical-first-order"
    label: ClassVar[str] = "quasi-chemical, first order"
    year: ClassVar[int] = 1952
    source: ClassVar[str] = "expansion of Guggenheim, Mixtures (Oxford, 1952), chapters 4 and 10"
    parameters: ClassVar[tuple[Parameter, ...]] = (
        Parameter("eps_ij - (eps_ii + eps_jj)/2", "J/mol or kT", "interchange energy of a contact, one per pair"),
        Parameter("q_i", "1", "surface of a molecule in segments"),
        Parameter("z", "1", "lattice coordination number"),
    )
    adjustable: ClassVar[Adjustable] = Adjustable.INTERCHANGE
    readings: ClassVar[tuple[Reading, ...]] = BOTH
    claims: ClassVar[frozenset[Claim]] = COMPOSITION_DEPENDENT

    def _parts(self, given: ModelInput) -> tuple[Array, Array, Array]:
        """theta_i, (w theta)_i, W with a trailing axis of length one."""
        theta = given.mole_fractions * given.surface
        theta = theta / theta.sum(axis=-1, keepdims=True)
        around = (given.interchange * theta[..., None, :]).sum(axis=-1)
        return theta, around, (around * theta).sum(axis=-1, keepdims=True)

    def ratios(self, given: ModelInput, reading: Reading) -> Array:
        """(q_j/q_i)(1 + d_i + d_j + m w_ij)/(1 + 2 d_i); NaN where the expansion gives a count below zero."""
        m = given.contacts(reading)
        _, around, mean = self._parts(given)
        change = m[..., 0] * (0.5 * mean - around)
        pairs = 1.0 + change[..., :, None] + change[..., None, :] + m * given.interchange
        own = 1.0 + 2.0 * change
        surface = given.surface
        ratio = surface[..., None, :] / surface[..., :, None] * pairs / own[..., :, None]
        return np.asarray(np.where((pairs.real > 0.0) & (own.real[..., :, None] > 0.0), ratio, np.nan))

    def center_contacts(self, given: ModelInput) -> Array:
        """q_i."""
        return given.surface * np.ones_like(given.mole_fractions)

    def energy_contacts(self, given: ModelInput, reading: Reading) -> Array:
        """z/2 under either reading."""
        return Reading.ALL_CONTACTS.contacts(given.z)

    def residual(self, given: ModelInput, reading: Reading) -> Array:
        """Derivative of the excess function by the number of molecules i."""
        m = given.contacts(reading)[..., 0]
        theta, around, mean = self._parts(given)
        w = given.interchange
        square = (theta * around**2).sum(axis=-1, keepdims=True)
        second = (w**2 * theta[..., None, :]).sum(axis=-1)
        variance = (second * theta).sum(axis=-1, keepdims=True)
        f = mean + 0.5 * m * (mean**2 - 2.0 * square + variance)
        mixed = (w * (theta * around)[..., None, :]).sum(axis=-1)
        slope = 2.0 * around + m * (2.0 * mean * around - around**2 - 2.0 * mixed + second)
        # homogeneous pieces of degree 2, 4, 3 and 2 in theta
        euler = 2.0 * mean + 0.5 * m * (4.0 * mean**2 - 6.0 * square + 2.0 * variance)
        half_z = Reading.ALL_CONTACTS.contacts(given.z)[..., None]
        return np.asarray(-half_z * given.surface * (f + slope - euler))

    def combinatorial(self, given: ModelInput) -> Array:
        """Staverman-Guggenheim."""
        return staverman_guggenheim(given.mole_fractions, given.volume, given.surface, given.z)


OFFERED = (FirstOrderQuasiChemical(),)
