"""What is solved: a `Mixture` of square-well spheres and the `State` it is in; checks at the door."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike

from ozsolve.errors import InputError
from ozsolve.potential import MAX_SIZE_RATIO, Array, PairOverride, PairTable, combine, symmetric, vector

FRACTION_SUM_TOLERANCE = 1e-9
MAX_PACKING_FRACTION = 0.55
MAX_REDUCED_DEPTH = 100.0
"""Largest beta eps; branches of physical solutions end long before."""


class Mixture:
    """Spheres with square wells, any number of species.

    Parameters
    ----------
    diameter : float or sequence of float
        sigma_ii per species, length unit of the caller's choice.
    well_depth : float or sequence of float
        eps_ii per species, energy unit; 0 is a hard sphere, negative a shoulder.
    well_range : float or sequence of float, default 1.5
        lam_i > 1; the well of a pair of i ends at lam_i sigma_ii.
    k, l : float or (s, s) array, default 0
        Deviations from the geometric and arithmetic combining rules.
    names : sequence of str, optional
        Species names; "1", "2", ... when omitted.
    overrides : sequence of PairOverride
        Pairs given outright.

    Raises
    ------
    InputError
        Names the argument, the value and what is allowed.

    Examples
    --------
    >>> m = Mixture([1.0, 1.5], [1.0, 1.5], k=0.1)
    >>> [round(float(e), 6) for e in m.pairs.well_depth[0]]
    [1.0, 1.10227]
    """

    __slots__ = ("diameter", "names", "pairs")

    diameter: Array
    names: tuple[str, ...]
    pairs: PairTable

    def __init__(
        self,
        diameter: ArrayLike,
        well_depth: ArrayLike,
        well_range: ArrayLike = 1.5,
        k: ArrayLike = 0.0,
        l: ArrayLike = 0.0,
        names: Sequence[str] | None = None,
        overrides: Sequence[PairOverride] = (),
    ) -> None:
        sigma = vector("diameter", diameter)
        size = sigma.size
        if np.any(sigma <= 0.0):
            raise InputError("diameter", sigma.tolist(), "every diameter must be positive")
        if sigma.max() / sigma.min() > MAX_SIZE_RATIO:
            raise InputError("diameter", sigma.tolist(), f"size ratios up to {MAX_SIZE_RATIO:g} are supported")
        lam = vector("well_range", well_range, size)
        if np.any(lam <= 1.0):
            raise InputError("well_range", lam.tolist(), "must be larger than 1 (well edge in core diameters)")
        depth = vector("well_depth", well_depth, size)
        table = combine(sigma, depth, lam, symmetric("k", k, size), symmetric("l", l, size), tuple(overrides))
        labels = tuple(names) if names is not None else tuple(str(i + 1) for i in range(size))
        if len(labels) != size or len(set(labels)) != size:
            raise InputError("names", labels, f"give {size} different names")
        sigma.setflags(write=False)
        object.__setattr__(self, "diameter", sigma)
        object.__setattr__(self, "names", labels)
        object.__setattr__(self, "pairs", table)

    def __setattr__(self, name: str, value: object) -> None:
        raise AttributeError(f"Mixture is immutable; cannot set {name}")

    def __reduce__(self) -> tuple[object, ...]:
        return (_rebuild, (self.diameter, self.names, self.pairs))

    def __repr__(self) -> str:
        return f"Mixture({', '.join(self.names)}; sigma = {self.diameter.tolist()})"

    @property
    def species(self) -> int:
        """Number of species s."""
        return int(self.diameter.size)

    def athermal(self) -> Mixture:
        """The same cores and shells with wells of no depth: what is left at infinite temperature."""
        pairs = self.pairs
        return _rebuild(
            self.diameter, self.names, PairTable(pairs.diameter, np.zeros_like(pairs.well_depth), pairs.well_edge)
        )

    def subset(self, species: Sequence[int]) -> Mixture:
        """Some of the species, in the order given, with their pairs as they are here.

        Raises
        ------
        InputError
            If a number is not a species' or comes twice.
        """
        chosen = list(species)
        if not chosen or len(set(chosen)) != len(chosen) or not set(chosen) <= set(range(self.species)):
            raise InputError("species", chosen, f"different numbers from 0 to {self.species - 1}")
        pick = np.ix_(chosen, chosen)
        pairs = self.pairs
        table = PairTable(pairs.diameter[pick], pairs.well_depth[pick], pairs.well_edge[pick])
        diameter = self.diameter[chosen]
        diameter.setflags(write=False)
        return _rebuild(diameter, tuple(self.names[i] for i in chosen), table)

    def densities(self, state: State) -> Array:
        """Number densities rho_i, shape (s,), in inverse cubed length units."""
        x = np.asarray(state.mole_fractions)
        if x.size != self.species:
            raise InputError(
                "mole_fractions", list(state.mole_fractions), f"give {self.species} numbers, one per species"
            )
        if state.density is not None:
            rho = state.density
        else:
            assert state.packing_fraction is not None
            rho = state.packing_fraction * 6.0 / math.pi / float(np.sum(x * self.diameter**3))
        eta = math.pi / 6.0 * rho * float(np.sum(x * self.diameter**3))
        if not 0.0 < eta < MAX_PACKING_FRACTION:
            raise InputError("density", rho, f"packing fraction {eta:.4g} must lie inside (0, {MAX_PACKING_FRACTION})")
        return x * rho

    def reduced_depths(self, state: State) -> Array:
        """beta eps_ij, shape (s, s).

        Raises
        ------
        InputError
            If the temperature is absurdly low for these wells.
        """
        depth = self.pairs.well_depth / state.temperature
        if depth.max() > MAX_REDUCED_DEPTH:
            lowest = float(self.pairs.well_depth.max()) / MAX_REDUCED_DEPTH
            raise InputError("temperature", state.temperature, f"must be at least {lowest:.4g} for wells this deep")
        return depth

    def packing_fraction(self, state: State) -> float:
        """eta = (pi/6) sum_i rho_i sigma_ii^3, dimensionless."""
        return float(math.pi / 6.0 * np.sum(self.densities(state) * self.diameter**3))


def _rebuild(diameter: Array, names: tuple[str, ...], pairs: PairTable) -> Mixture:
    mixture = object.__new__(Mixture)
    object.__setattr__(mixture, "diameter", diameter)
    object.__setattr__(mixture, "names", names)
    object.__setattr__(mixture, "pairs", pairs)
    return mixture


@dataclass(frozen=True)
class State:
    """Temperature, composition and density.

    Parameters
    ----------
    temperature : float
        kT in the mixture's energy unit (with depths in kelvin: the temperature in kelvin), positive.
    mole_fractions : sequence of float
        One per species, each in [0, 1], summing to one; 0 is the dilute limit.
    packing_fraction : float, optional
        eta inside (0, 0.55). Give this or `density`.
    density : float, optional
        Total number density in inverse cubed length units.

    Raises
    ------
    InputError
        Names the argument, the value and what is allowed.
    """

    temperature: float
    mole_fractions: tuple[float, ...] = field(default=(1.0,))
    packing_fraction: float | None = None
    density: float | None = None

    def __post_init__(self) -> None:
        x = vector("mole_fractions", self.mole_fractions)
        object.__setattr__(self, "mole_fractions", tuple(float(v) for v in x))
        if np.any(x < 0.0) or np.any(x > 1.0):
            raise InputError("mole_fractions", x.tolist(), "each must lie in [0, 1]")
        if abs(float(x.sum()) - 1.0) > FRACTION_SUM_TOLERANCE:
            raise InputError("mole_fractions", x.tolist(), f"they must sum to 1, not {x.sum():.12g}")
        _positive("temperature", self.temperature)
        if (self.packing_fraction is None) == (self.density is None):
            raise InputError(
                "packing_fraction, density",
                (self.packing_fraction, self.density),
                "give exactly one of the two",
            )
        if self.density is not None:
            _positive("density", self.density)
        elif not _is_number(self.packing_fraction) or not 0.0 < float(self.packing_fraction) < MAX_PACKING_FRACTION:  # type: ignore[arg-type]
            raise InputError("packing_fraction", self.packing_fraction, f"must lie inside (0, {MAX_PACKING_FRACTION})")


def _is_number(value: object) -> bool:
    return isinstance(value, int | float | np.floating) and not isinstance(value, bool) and math.isfinite(value)


def _positive(name: str, value: object) -> None:
    if not _is_number(value) or float(value) <= 0.0:  # type: ignore[arg-type]
        raise InputError(name, value, "must be a positive finite number")
