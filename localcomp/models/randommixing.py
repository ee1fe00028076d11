"""Random mixing: neighbours in proportion to mole, surface, volume or pair-volume fractions."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from localcomp.models.base import EVERY_CLAIM, Adjustable, Array, Claim, ModelInput, Parameter, Reading
from localcomp.models.combinatorial import flory_huggins, staverman_guggenheim


@dataclass(frozen=True)
class RandomMixing:
    """R_ij = 1, q_j/q_i, v_j/v_i or (sigma_ij/sigma_ii)^3, whatever the energies.

    By mole, surface and volume the residual excess function is that of the regular solution,
    -m a sum_ij f_i f_j w_ij with fractions f and contacts a = sum x_i a_i, a_i = 1, q_i, v_i. By pair
    volume it is van der Waals' one fluid, -m [sum_ij x_i x_j beta eps_ij sigma_ij^3/sum x_k sigma_k^3 -
    sum_i x_i beta eps_ii] at constant packing fraction. The reading changes the energy, not the ratio.

    Attributes
    ----------
    by : {"mole", "surface", "volume", "pair volume"}
    """

    by: str = "mole"
    parameters: ClassVar[tuple[Parameter, ...]] = (
        Parameter("w_ij", "J/mol or kT", "interchange energy, one per pair"),
        Parameter("v_i or q_i", "1", "volume or surface of a molecule"),
    )
    readings: ClassVar[tuple[Reading, ...]] = (Reading.ALL_CONTACTS,)
    claims: ClassVar[frozenset[Claim]] = EVERY_CLAIM

    @property
    def name(self) -> str:
        """The word used in files."""
        return f"random-{self.by.replace(' ', '-')}"

    @property
    def label(self) -> str:
        """Name with its fractions."""
        return f"random mixing by {self.by}"

    @property
    def adjustable(self) -> Adjustable:
        """The unlike energy in van der Waals' one fluid, which needs the pure energies too."""
        return Adjustable.UNLIKE if self.by == "pair volume" else Adjustable.INTERCHANGE

    @property
    def year(self) -> int:
        """Of the source."""
        return 1890 if self.by == "pair volume" else 1931

    @property
    def source(self) -> str:
        """Regular solutions, or van der Waals' mixtures."""
        if self.by == "pair volume":
            return "van der Waals, Z. Phys. Chem. 5 (1890) 133; Leland et al., Trans. Faraday Soc. 64 (1968) 1447"
        return "Scatchard, Chem. Rev. 8 (1931) 321; Hildebrand and Wood, J. Chem. Phys. 1 (1933) 817"

    def _weight(self, given: ModelInput) -> Array:
        if self.by == "surface":
            return given.surface
        return given.volume if self.by == "volume" else np.ones_like(given.diameter)

    def ratios(self, given: ModelInput, reading: Reading) -> Array:
        """Free of the energies."""
        if self.by == "pair volume":
            pair = given.pair_volume
            ratio = pair / np.diagonal(pair, axis1=-2, axis2=-1)[..., :, None]
        else:
            weight = self._weight(given)
            ratio = weight[..., None, :] / weight[..., :, None]
        return np.asarray(ratio * np.ones_like(given.reduced_depth))

    def center_contacts(self, given: ModelInput) -> Array:
        """1, q_i, v_i, or sum_j x_j sigma_ij^3 / sum_k x_k sigma_k^3."""
        if self.by == "pair volume":
            around = (given.pair_volume * given.mole_fractions[..., None, :]).sum(axis=-1)
            return np.asarray(around / (given.volume * given.mole_fractions).sum(axis=-1, keepdims=True))
        return self._weight(given) * np.ones_like(given.mole_fractions)

    def energy_contacts(self, given: ModelInput, reading: Reading) -> Array:
        """m."""
        return reading.contacts(given.z)

    def residual(self, given: ModelInput, reading: Reading) -> Array:
        """Derivative of the residual excess function by the number of molecules i."""
        m, x = given.contacts(reading)[..., 0], given.mole_fractions
        if self.by == "pair volume":
            energy = given.reduced_depth * given.pair_volume
            total = (given.volume * x).sum(axis=-1, keepdims=True)
            around = (energy * x[..., None, :]).sum(axis=-1) / total
            mean = (around * x).sum(axis=-1, keepdims=True)
            own = np.diagonal(given.reduced_depth, axis1=-2, axis2=-1)
            return np.asarray(-m * (2.0 * around - given.volume / total * mean - own))
        weight = self._weight(given)
        fraction = x * weight
        fraction = fraction / fraction.sum(axis=-1, keepdims=True)
        around = (given.interchange * fraction[..., None, :]).sum(axis=-1)
        return np.asarray(-m * weight * (2.0 * around - (around * fraction).sum(axis=-1, keepdims=True)))

    def combinatorial(self, given: ModelInput) -> Array:
        """None by mole, Staverman-Guggenheim by surface, Flory-Huggins by volume."""
        if self.by == "mole":
            return np.zeros_like(given.mole_fractions)
        if self.by == "surface":
            return staverman_guggenheim(given.mole_fractions, given.volume, given.surface, given.z)
        return flory_huggins(given.mole_fractions, given.volume)


OFFERED = (RandomMixing("mole"), RandomMixing("surface"), RandomMixing("volume"), RandomMixing("pair volume"))
