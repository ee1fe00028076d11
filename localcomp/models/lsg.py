"""Lattice-surface model (LSG): UNIQUAC's ratio for single contacts, z/2 of them in the energy."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from localcomp.models.base import BOTH, EVERY_CLAIM, Adjustable, Array, Claim, ModelInput, Parameter, Reading
from localcomp.models.combinatorial import staverman_guggenheim
from localcomp.models.uniquac import surface_ratios, uniquac_residual


@dataclass(frozen=True)
class LatticeSurface:
    """R_ij = (q_j/q_i) exp(m D_ij) and G_E/NkT = -(z/2m) sum_i q_i x_i ln sum_j theta_j exp(m D_ij) (residual).

    Derived for m = 1; with m = z/2 it is UNIQUAC.
    """

    name: ClassVar[str] = "lsg"
    label: ClassVar[str] = "LSG (lattice-surface)"
    year: ClassVar[int] = 1977
    source: ClassVar[str] = "Vera, Sayegh and Ratcliff, Fluid Phase Equilib. 1 (1977) 113 (recalled, not re-read)"
    parameters: ClassVar[tuple[Parameter, ...]] = (
        Parameter("u_ij - u_jj", "J/mol or kT", "-(eps_ij - eps_jj) of one contact, two per pair"),
        Parameter("r_i, q_i", "1", "volume and surface of a molecule in segments"),
        Parameter("z", "1", "lattice coordination number"),
    )
    adjustable: ClassVar[Adjustable] = Adjustable.EXCHANGE
    readings: ClassVar[tuple[Reading, ...]] = BOTH
    claims: ClassVar[frozenset[Claim]] = EVERY_CLAIM

    def ratios(self, given: ModelInput, reading: Reading) -> Array:
        """(q_j/q_i) exp(m D_ij)."""
        return surface_ratios(given, reading)

    def center_contacts(self, given: ModelInput) -> Array:
        """q_i."""
        return given.surface * np.ones_like(given.mole_fractions)

    def energy_contacts(self, given: ModelInput, reading: Reading) -> Array:
        """z/2 under either reading."""
        return Reading.ALL_CONTACTS.contacts(given.z)

    def residual(self, given: ModelInput, reading: Reading) -> Array:
        """(z/2m) times UNIQUAC's expression."""
        tau = np.exp(np.swapaxes(given.contacts(reading) * given.exchange, -1, -2))
        repeats = Reading.ALL_CONTACTS.contacts(given.z) / reading.contacts(given.z)
        return np.asarray(repeats[..., None] * uniquac_residual(given.mole_fractions, given.surface, tau))

    def combinatorial(self, given: ModelInput) -> Array:
        """Staverman-Guggenheim."""
        return staverman_guggenheim(given.mole_fractions, given.volume, given.surface, given.z)


OFFERED = (LatticeSurface(),)
