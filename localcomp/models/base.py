"""What every activity model is given and what it gives back.

All functions take leading batch axes: tables of pairs are (..., s, s), of species (..., s).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from enum import Enum
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from ozsolve import Mixture, State

Array = NDArray[np.float64]

LATTICE_COORDINATION = 10.0
"""z of the lattice models unless given or measured (Abrams and Prausnitz, AIChE J. 21 (1975) 116)."""


class Reading(Enum):
    """The energy a model's parameter stands for: m contacts.

    m = 1: one contact. m = z/2: all contacts of a molecule, each shared by two.
    """

    ONE_CONTACT = "m = 1"
    ALL_CONTACTS = "m = z/2"

    def contacts(self, z: Array | float) -> Array:
        """m for the lattice coordination number z."""
        z = np.asarray(z, float)
        return np.ones_like(z) if self is Reading.ONE_CONTACT else z / 2.0

    def label(self, z: float | None = None) -> str:
        """For tables; with its number when z is the same everywhere."""
        return self.value if z is None or self is Reading.ONE_CONTACT else f"{self.value} = {z / 2.0:g}"


BOTH = (Reading.ONE_CONTACT, Reading.ALL_CONTACTS)


@dataclass(frozen=True)
class Parameter:
    """An adjustable or structural parameter of a model.

    Attributes
    ----------
    symbol, unit, meaning : str
    """

    symbol: str
    unit: str
    meaning: str


class Claim(Enum):
    """What activity models suppose about neighbours; the number is the one of tables and figures."""

    COMPOSITION_FREE = 1
    BOLTZMANN = 2
    ATHERMAL_LIMIT = 3
    PRODUCT = 4
    RECIPROCITY = 5
    DENSITY_FREE = 6
    CONSTANT_COORDINATION = 7
    TERNARY = 8
    ENERGY = 9
    SHELL_RULE = 10


EVERY_CLAIM = frozenset(Claim)
COMPOSITION_DEPENDENT = EVERY_CLAIM - {Claim.COMPOSITION_FREE, Claim.TERNARY}
"""Of models whose ratios follow composition, and so differ between a ternary and its binaries."""


@dataclass(frozen=True)
class ModelInput:
    """What a model may use.

    Attributes
    ----------
    reduced_depth : ndarray, shape (..., s, s)
        beta eps_ij.
    diameter : ndarray, shape (..., s)
        sigma_ii.
    mole_fractions : ndarray, shape (..., s)
    pair_diameter : ndarray, shape (..., s, s), optional
        sigma_ij; arithmetic means unless given.
    z : float or ndarray, shape (...)
        Lattice coordination number.
    segment : float, optional
        Diameter of the segment that r and q are counted in; the smallest sphere unless given.
    given_exchange : ndarray, shape (..., s, s), optional
        D_ij outright, as a fit has them; need not come from any table of depths.
    """

    reduced_depth: Array
    diameter: Array
    mole_fractions: Array
    pair_diameter: Array | None = None
    z: Array | float = LATTICE_COORDINATION
    segment: float | None = None
    given_exchange: Array | None = None

    @classmethod
    def of(cls, mixture: Mixture, state: State, z: float = LATTICE_COORDINATION) -> ModelInput:
        """Read off a mixture and its state."""
        return cls(
            mixture.pairs.well_depth / state.temperature,
            mixture.diameter,
            np.asarray(state.mole_fractions),
            mixture.pairs.diameter,
            z,
        )

    @property
    def exchange(self) -> Array:
        """D_ij = beta (eps_ij - eps_ii), shape (..., s, s)."""
        if self.given_exchange is not None:
            return self.given_exchange
        own = np.diagonal(self.reduced_depth, axis1=-2, axis2=-1)
        return self.reduced_depth - own[..., :, None]

    @property
    def interchange(self) -> Array:
        """w_ij = beta [eps_ij - (eps_ii + eps_jj)/2] = (D_ij + D_ji)/2, shape (..., s, s)."""
        if self.given_exchange is not None:
            return np.asarray(0.5 * (self.given_exchange + np.swapaxes(self.given_exchange, -1, -2)))
        half = 0.5 * np.diagonal(self.reduced_depth, axis1=-2, axis2=-1)
        return self.reduced_depth - half[..., :, None] - half[..., None, :]

    @property
    def surface(self) -> Array:
        """q_i = (sigma_i/sigma_segment)^2."""
        return np.asarray((self.diameter / self._unit[..., None]) ** 2)

    @property
    def volume(self) -> Array:
        """r_i = (sigma_i/sigma_segment)^3."""
        return np.asarray((self.diameter / self._unit[..., None]) ** 3)

    @property
    def _unit(self) -> Array:
        smallest = self.diameter.min(axis=-1)
        return np.asarray(smallest if self.segment is None else np.full_like(smallest, self.segment))

    @property
    def pair_volume(self) -> Array:
        """(sigma_ij/sigma_segment)^3, shape (..., s, s)."""
        pair = self.pair_diameter
        if pair is None:
            pair = 0.5 * (self.diameter[..., :, None] + self.diameter[..., None, :])
        return np.asarray((pair / self._unit[..., None, None]) ** 3)

    def contacts(self, reading: Reading) -> Array:
        """m, with two axes of length one behind the batch axes."""
        return reading.contacts(self.z)[..., None, None]

    def athermal(self) -> ModelInput:
        """The same mixture without wells."""
        given = self.given_exchange
        return replace(
            self,
            reduced_depth=np.zeros_like(self.reduced_depth),
            given_exchange=None if given is None else np.zeros_like(given),
        )


class Adjustable(Enum):
    """What is regressed for a pair: two exchange energies, one interchange energy, or the unlike energy alone."""

    EXCHANGE = ("D12", "D21")
    INTERCHANGE = ("w12",)
    UNLIKE = ("e12",)


class ActivityModel(Protocol):
    """An activity-coefficient model: what it says about neighbours and about ln gamma."""

    @property
    def name(self) -> str:
        """The word used in files and on the command line."""
        ...

    @property
    def label(self) -> str:
        """Name with its parameters, for tables."""
        ...

    @property
    def source(self) -> str:
        """Paper the model comes from."""
        ...

    @property
    def parameters(self) -> tuple[Parameter, ...]:
        """Its parameters with units."""
        ...

    @property
    def adjustable(self) -> Adjustable:
        """What is regressed for a pair."""
        ...

    @property
    def readings(self) -> Sequence[Reading]:
        """Readings under which its statement about neighbours differs; the usual one first."""
        ...

    @property
    def claims(self) -> frozenset[Claim]:
        """What it supposes about neighbours."""
        ...

    def ratios(self, given: ModelInput, reading: Reading) -> Array:
        """R_ij as the model states it, shape (..., s, s), 1 on the diagonal."""
        ...

    def center_contacts(self, given: ModelInput) -> Array:
        """Neighbours of a centre i over z: 1, q_i, ...; shape (..., s)."""
        ...

    def energy_contacts(self, given: ModelInput, reading: Reading) -> Array:
        """Contacts that carry the energy, per unit of `center_contacts` (each shared by two), shape (...)."""
        ...

    def residual(self, given: ModelInput, reading: Reading) -> Array:
        """Residual part of ln gamma_i, shape (..., s)."""
        ...

    def combinatorial(self, given: ModelInput) -> Array:
        """Combinatorial part of ln gamma_i, shape (..., s)."""
        ...


def ln_gamma(model: ActivityModel, given: ModelInput, reading: Reading) -> Array:
    """ln gamma_i, combinatorial and residual part together, shape (..., s)."""
    return np.asarray(model.combinatorial(given) + model.residual(given, reading))


def local_fractions(model: ActivityModel, given: ModelInput, reading: Reading) -> Array:
    """X_ij = x_j R_ij / sum_k x_k R_ik as the model states it, shape (..., s, s)."""
    weighted = given.mole_fractions[..., None, :] * model.ratios(given, reading)
    return np.asarray(weighted / weighted.sum(axis=-1, keepdims=True))


def excess_energy(model: ActivityModel, given: ModelInput, reading: Reading) -> Array:
    """Excess energy of the stated neighbours, per molecule in kT, shape (...).

    -a sum_i x_i [c_i sum_j X_ij beta eps_ij - c_i,pure beta eps_ii] with c_i the contacts of a centre and a
    the share of them that carries the energy: what is gained and lost when the neighbours of the pure
    liquids are exchanged for those the model states.
    """
    stated = local_fractions(model, given, reading)
    mixed = model.center_contacts(given) * (stated * given.reduced_depth).sum(axis=-1)
    own = np.diagonal(given.reduced_depth, axis1=-2, axis2=-1)
    change = (given.mole_fractions * (mixed - pure_contacts(model, given) * own)).sum(axis=-1)
    return np.asarray(-model.energy_contacts(given, reading) * change)


def pure_contacts(model: ActivityModel, given: ModelInput) -> Array:
    """Contacts of each molecule in its own pure liquid, over z; shape (..., s)."""
    alone = np.eye(given.mole_fractions.shape[-1])
    return np.stack(
        [model.center_contacts(replace(given, mole_fractions=x))[..., i] for i, x in enumerate(alone)], axis=-1
    )


@dataclass(frozen=True)
class Statement:
    """One model's statement under one reading, held against what was found.

    Attributes
    ----------
    model : ActivityModel
    reading : Reading
    contacts : float
        m of that reading.
    stated : ndarray, shape (s, s)
        R_ij of the model.
    off : ndarray, shape (s, s)
        stated/found: 1 where the model is right, 2 where it states twice the ratio found.
    """

    model: ActivityModel
    reading: Reading
    contacts: float
    stated: Array
    off: Array


def compare(found: Array, given: ModelInput, models: Sequence[ActivityModel]) -> list[Statement]:
    """Every model under each of its readings against the found neighbour ratios, shape (s, s)."""
    out = []
    for model in models:
        for reading in model.readings:
            with np.errstate(over="ignore"):  # high shoulders: the model then states infinity
                stated = model.ratios(given, reading)
            out.append(Statement(model, reading, float(reading.contacts(given.z)), stated, stated / found))
    return out
