"""NRTL: R_ij = exp(alpha m D_ij)."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from localcomp.models.base import Array, Reading, StatementInput, readings


@dataclass(frozen=True)
class Nrtl:
    """Wilson's ratio with the nonrandomness parameter alpha in the exponent.

    Attributes
    ----------
    alpha : float
        Nonrandomness, dimensionless; 0.2, 0.3 and 0.47 are the usual choices.
    """

    alpha: float = 0.3
    source: ClassVar[str] = "Renon and Prausnitz, AIChE J. 14 (1968) 135"

    @property
    def label(self) -> str:
        """Name with alpha."""
        return f"NRTL (alpha = {self.alpha:g})"

    @property
    def readings(self) -> tuple[Reading, ...]:
        """One contact, and all contacts of a molecule."""
        return readings()

    def ratios(self, given: StatementInput, reading: Reading) -> Array:
        """R_ij, shape (s, s)."""
        return np.asarray(np.exp(self.alpha * reading.contacts * given.exchange))
