"""What every activity model is given and what it gives back."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from ozsolve import Mixture, State

Array = NDArray[np.float64]

LATTICE_COORDINATION = 10.0
"""z of the lattice models unless given (Abrams and Prausnitz, AIChE J. 21 (1975) 116)."""


@dataclass(frozen=True)
class Reading:
    """The energy a model's parameter stands for: m contacts.

    Attributes
    ----------
    contacts : float
        m = 1: one contact. m = z/2: all contacts of a molecule, each shared by two.
    label : str
    """

    contacts: float
    label: str


def readings(z: float = LATTICE_COORDINATION) -> tuple[Reading, Reading]:
    """Both readings for a lattice coordination number z."""
    return Reading(1.0, "m = 1"), Reading(z / 2.0, f"m = z/2 = {z / 2.0:g}")


@dataclass(frozen=True)
class StatementInput:
    """What a model may use to state neighbour ratios.

    Attributes
    ----------
    reduced_depth : ndarray, shape (s, s)
        beta eps_ij.
    diameter : ndarray, shape (s,)
        sigma_ii; surfaces q_i go with its square, volumes v_i with its cube.
    mole_fractions : ndarray, shape (s,)
    """

    reduced_depth: Array
    diameter: Array
    mole_fractions: Array

    @classmethod
    def of(cls, mixture: Mixture, state: State) -> StatementInput:
        """Read off a mixture and its state."""
        return cls(mixture.pairs.well_depth / state.temperature, mixture.diameter, np.asarray(state.mole_fractions))

    @property
    def exchange(self) -> Array:
        """D_ij = beta (eps_ij - eps_ii), shape (s, s)."""
        return self.reduced_depth - np.diag(self.reduced_depth)[:, None]


class StatementModel(Protocol):
    """An activity model's statement about neighbours."""

    @property
    def label(self) -> str:
        """Name with its parameters, for tables."""
        ...

    @property
    def source(self) -> str:
        """Paper the statement comes from."""
        ...

    @property
    def readings(self) -> Sequence[Reading]:
        """Readings of its energy parameter that are in use."""
        ...

    def ratios(self, given: StatementInput, reading: Reading) -> Array:
        """R_ij as the model states it, shape (s, s), 1 on the diagonal."""
        ...


@dataclass(frozen=True)
class Statement:
    """One model's statement under one reading, held against what was found.

    Attributes
    ----------
    model : StatementModel
    reading : Reading
    stated : ndarray, shape (s, s)
        R_ij of the model.
    off : ndarray, shape (s, s)
        stated/found: 1 where the model is right, 2 where it states twice the ratio found.
    """

    model: StatementModel
    reading: Reading
    stated: Array
    off: Array


def compare(found: Array, given: StatementInput, models: Sequence[StatementModel]) -> list[Statement]:
    """Every model under each of its readings against the found neighbour ratios, shape (s, s)."""
    out = []
    for model in models:
        for reading in model.readings:
            with np.errstate(over="ignore"):  # high shoulders: the model then states infinity
                stated = model.ratios(given, reading)
            out.append(Statement(model, reading, stated, stated / found))
    return out
