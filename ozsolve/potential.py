"""Pair table of square wells: cores, well edges, depths; combining rules and overrides.

u_ij(r) = infinity for r < sigma_ij, -eps_ij for sigma_ij < r < lam_ij sigma_ij, 0 beyond. A positive
depth attracts, a negative one is a shoulder, zero is a hard sphere.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from ozsolve.errors import InputError

Array = NDArray[np.float64]
Indices = NDArray[np.intp]
Flags = NDArray[np.bool_]

ARITHMETIC_RULE = "sigma_ij = (1 - l_ij) (sigma_i + sigma_j)/2"
GEOMETRIC_RULE = "eps_ij = (1 - k_ij) sqrt(eps_i eps_j)"


@dataclass(frozen=True)
class PairOverride:
    """One pair given outright; a field left at None keeps the combining rule's value.

    Parameters
    ----------
    first, second : int
        The two species, counted from 0.
    diameter : float, optional
        sigma_ij in the length unit, positive.
    well_depth : float, optional
        eps_ij in the energy unit; negative is a shoulder.
    well_range : float, optional
        lam_ij, larger than 1: the well ends at lam_ij sigma_ij.
    """

    first: int
    second: int
    diameter: float | None = None
    well_depth: float | None = None
    well_range: float | None = None


@dataclass(frozen=True)
class PairTable:
    """Symmetric tables of the pair potential, each of shape (s, s).

    Attributes
    ----------
    diameter : ndarray, shape (s, s)
        sigma_ij, length unit.
    well_depth : ndarray, shape (s, s)
        eps_ij, energy unit.
    well_edge : ndarray, shape (s, s)
        lam_ij sigma_ij, length unit.
    """

    diameter: Array
    well_depth: Array
    well_edge: Array

    def __post_init__(self) -> None:
        for table in (self.diameter, self.well_depth, self.well_edge):
            table.setflags(write=False)

    @property
    def well_range(self) -> Array:
        """lam_ij, shape (s, s)."""
        return self.well_edge / self.diameter


def vector(field: str, value: ArrayLike, size: int | None = None) -> Array:
    """A finite float vector, or an `InputError` that says what is wrong with it."""
    try:
        array = np.atleast_1d(np.asarray(value, dtype=np.float64))
    except (TypeError, ValueError):
        raise InputError(field, value, "give numbers") from None
    if array.ndim != 1 or array.size == 0:
        raise InputError(field, value, "give one number per species")
    if size is not None and array.size == 1:
        array = np.repeat(array, size)
    if size is not None and array.size != size:
        raise InputError(field, value, f"give one number, or {size} numbers, one per species")
    if not np.all(np.isfinite(array)):
        raise InputError(field, value, "every number must be finite")
    return array


def symmetric(field: str, value: ArrayLike, size: int) -> Array:
    """A symmetric (size, size) matrix from a number or a full matrix; its diagonal must be 0."""
    try:
        array = np.asarray(value, dtype=np.float64)
    except (TypeError, ValueError):
        raise InputError(field, value, "give a number or a full matrix of numbers") from None
    if array.ndim == 0:
        array = np.full((size, size), float(array)) * (1.0 - np.eye(size))
    if array.shape != (size, size):
        raise InputError(field, value, f"give a number or a full {size} x {size} matrix")
    if not np.all(np.isfinite(array)):
        raise InputError(field, value, "every number must be finite")
    if not np.array_equal(array, array.T):
        raise InputError(field, value, "the matrix must be symmetric")
    if np.any(np.diag(array) != 0.0):
        raise InputError(field, value, "the diagonal must be 0 (a species' own values are given outright)")
    return array


def combine(
    diameter: Array, well_depth: Array, well_range: Array, k: Array, l: Array, overrides: tuple[PairOverride, ...] = ()
) -> PairTable:
    """Apply the combining rules, then the overrides.

    sigma_ij = (1 - l_ij)(sigma_i + sigma_j)/2, eps_ij = (1 - k_ij) sqrt(eps_i eps_j) (two shoulders
    combine to a shoulder), lam_ij sigma_ij = (1 - l_ij)(lam_i sigma_i + lam_j sigma_j)/2, so that
    equal ranges stay equal (common practice, no source; the first two are Lorentz, Ann. Phys. 248
    (1881) 127 and Berthelot, C. R. Acad. Sci. 126 (1898) 1703).

    Parameters
    ----------
    diameter, well_depth, well_range : ndarray, shape (s,)
    k, l : ndarray, shape (s, s)
        Deviations from the combining rules, zero on the diagonal.

    Raises
    ------
    InputError
        If a well and a shoulder meet without an explicit pair depth, or the table is not physical.
    """
    size = diameter.size
    shrink = 1.0 - l
    core = shrink * 0.5 * (diameter[:, None] + diameter[None, :])
    wall = diameter * well_range
    edge = shrink * 0.5 * (wall[:, None] + wall[None, :])
    product = well_depth[:, None] * well_depth[None, :]
    sign = np.where(well_depth[:, None] + well_depth[None, :] < 0.0, -1.0, 1.0)
    depth = (1.0 - k) * sign * np.sqrt(np.abs(product))
    np.fill_diagonal(depth, well_depth)
    np.fill_diagonal(edge, wall)
    given_depth = np.eye(size, dtype=bool)
    for pair in overrides:
        _apply(pair, core, depth, edge, given_depth)
    mixed = (product < 0.0) & ~given_depth
    if np.any(mixed):
        i, j = (int(n) for n in np.argwhere(mixed)[0])
        raise InputError(
            f"well_depth of pair ({i}, {j})",
            (float(well_depth[i]), float(well_depth[j])),
            "a well and a shoulder have no geometric mean: give this pair's depth outright",
        )
    _check_table(core, edge)
    return PairTable(core, depth, edge)


def _apply(pair: PairOverride, core: Array, depth: Array, edge: Array, given_depth: NDArray[np.bool_]) -> None:
    i, j = pair.first, pair.second
    size = len(core)
    if not (0 <= i < size and 0 <= j < size) or i == j:
        raise InputError("pair", (i, j), f"name two different species out of 0..{size - 1}")
    for name, value in (
        ("diameter", pair.diameter),
        ("well_depth", pair.well_depth),
        ("well_range", pair.well_range),
    ):
        if value is not None and not np.isfinite(value):
            raise InputError(f"{name} of pair ({i}, {j})", value, "must be a finite number")
    reach = edge[i, j] / core[i, j] if pair.well_range is None else pair.well_range
    if pair.diameter is not None:
        core[i, j] = core[j, i] = pair.diameter
    edge[i, j] = edge[j, i] = reach * core[i, j]
    if pair.well_depth is not None:
        depth[i, j] = depth[j, i] = pair.well_depth
        given_depth[i, j] = given_depth[j, i] = True


MAX_SIZE_RATIO = 20.0
MAX_REACH = 100.0
"""Longest well over smallest diameter: the grid has to span one and resolve the other."""


def _check_table(core: Array, edge: Array) -> None:
    if core.max() > MAX_SIZE_RATIO * core.min() > 0.0 or edge.max() > MAX_REACH * core.min() > 0.0:
        raise InputError(
            "diameter",
            [float(core.min()), float(core.max()), float(edge.max())],
            f"over all pairs (smallest, largest, longest well) size ratios up to {MAX_SIZE_RATIO:g} and wells up to "
            f"{MAX_REACH:g} smallest diameters are supported",
        )
    for i, j in zip(*np.triu_indices(len(core)), strict=True):
        if core[i, j] <= 0.0:
            raise InputError(f"diameter of pair ({i}, {j})", float(core[i, j]), "must be positive")
        if edge[i, j] <= core[i, j]:
            raise InputError(
                f"well_range of pair ({i}, {j})",
                float(edge[i, j] / core[i, j]),
                "must be larger than 1 (the well lies outside the core)",
            )
