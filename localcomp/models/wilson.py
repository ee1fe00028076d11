"""Wilson: R_ij = exp(m D_ij)."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from localcomp.models.base import Array, Reading, StatementInput, readings


@dataclass(frozen=True)
class Wilson:
    """Local mole fractions in the ratio x_ij/x_ii = (x_j/x_i) exp[m beta (eps_ij - eps_ii)]."""

    label: ClassVar[str] = "Wilson"
    source: ClassVar[str] = "Wilson, J. Am. Chem. Soc. 86 (1964) 127"

    @property
    def readings(self) -> tuple[Reading, ...]:
        """One contact, and all contacts of a molecule."""
        return readings()

    def ratios(self, given: StatementInput, reading: Reading) -> Array:
        """R_ij, shape (s, s)."""
        return np.asarray(np.exp(reading.contacts * given.exchange))
