"""Who sits next to whom: coordination numbers, local mole fractions, neighbour ratios.

The first index is the centre: N_ij is the mean number of j in the shell of one i. The literature
often writes the neighbour first, x_ji for what is X_ij here.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from localcomp.errors import NoAnswer
from localcomp.shells import FirstMinimum, ShellRule, WellEdge, informative_multiple
from ozsolve import Solution

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Neighbors:
    """Neighbours of one solution under one shell rule; all tables (s, s), row = centre.

    Attributes
    ----------
    rule : ShellRule
    radius : ndarray
        L_ij, length unit of the mixture.
    coordination_numbers : ndarray
        N_ij = 4 pi rho_j int_0^L_ij g_ij r^2 dr.
    local_mole_fractions : ndarray
        X_ij = N_ij / sum_k N_ik.
    neighbor_ratios : ndarray
        R_ij = (N_ij/N_ii)/(x_j/x_i), from shell integrals, so that it exists at infinite dilution too.
    coordination_errors, fraction_errors, ratio_errors : ndarray
        Absolute numerical error bars.
    """

    rule: ShellRule
    radius: Array
    coordination_numbers: Array
    local_mole_fractions: Array
    neighbor_ratios: Array
    coordination_errors: Array
    fraction_errors: Array
    ratio_errors: Array


def count_neighbors(solution: Solution, rule: ShellRule | None = None) -> Neighbors:
    """Integrate the first shell.

    Parameters
    ----------
    solution : Solution
    rule : ShellRule, default WellEdge()

    Raises
    ------
    NoAnswer
        If the solution failed, the rule has no radius at this state, or a shell holds nothing to
        compare with.

    Examples
    --------
    >>> from ozsolve import Mixture, State, solve
    >>> s = solve(Mixture([1.0, 1.0], [1.0, 1.0]), State(2.0, (0.3, 0.7), packing_fraction=0.4))
    >>> bool(abs(count_neighbors(s).neighbor_ratios[0, 1] - 1) < 1e-12)  # identical species
    True
    """
    if not solution.status.usable:
        raise NoAnswer(solution.message)
    rule = rule if rule is not None else WellEdge()
    radius = rule.radius(solution)
    integral, bar = solution.shell_integral(radius)
    moved = rule.uncertainty(solution)
    if moved.any():
        bar = bar + 4.0 * np.pi * _g_at(solution, radius) * radius**2 * moved
    _refuse_empty(solution, integral)
    rho = solution.densities
    counts = rho[None, :] * integral
    count_bars = rho[None, :] * bar
    total = counts.sum(axis=1, keepdims=True)
    fractions = counts / total
    size = np.abs(integral)
    relative = bar / np.where(size > 0.0, size, np.inf)
    ratios = integral / integral.diagonal()[:, None]
    ratio_bars = np.abs(ratios) * (relative + relative.diagonal()[:, None])
    ratio_bars.flat[:: len(rho) + 1] = 0.0
    fraction_bars = np.abs(fractions * (1.0 - fractions)) * (relative + relative.max(axis=1, keepdims=True))
    tables = (radius, counts, fractions, ratios, count_bars, fraction_bars, ratio_bars)
    for table in tables:
        table.setflags(write=False)
    return Neighbors(rule, *tables)


def _g_at(solution: Solution, radius: Array) -> Array:
    """g_ij at L_ij, the larger side of a step, shape (s, s)."""
    size = solution.mixture.species
    place = np.searchsorted(solution.r, radius)
    pick = [np.minimum(np.maximum(place + n, 0), len(solution.r) - 1) for n in (-1, 0)]
    i, j = np.indices((size, size))
    return np.asarray(np.maximum(solution.g_r[i, j, pick[0]], solution.g_r[i, j, pick[1]]))


def _refuse_empty(solution: Solution, integral: Array) -> None:
    """A shoulder too high to climb leaves nothing within the well edge, and ratios have no meaning."""
    if integral.diagonal().all():
        return
    for name, own in zip(solution.mixture.names, np.diag(integral), strict=True):
        if own == 0.0:
            raise NoAnswer(
                f"no {name} can be inside the shell of a {name}, so there is no ratio; use another shell rule"
            )


@dataclass(frozen=True)
class ShellSensitivity:
    """The same solution under several shell rules.

    Attributes
    ----------
    results : tuple of Neighbors
        One per rule that has an answer.
    missing : tuple of str
        Sentences about the rules that have none.
    spread : ndarray, shape (s, s)
        Largest minus smallest neighbour ratio over the rules.
    """

    results: tuple[Neighbors, ...]
    missing: tuple[str, ...]
    spread: Array


def shell_sensitivity(solution: Solution, multiple: float = 1.5) -> ShellSensitivity:
    """Neighbours under all three shell rules and how much the ratios hinge on the rule.

    Raises
    ------
    NoAnswer
        If no rule has an answer.
    """
    results: list[Neighbors] = []
    missing: list[str] = []
    for rule in (WellEdge(), FirstMinimum(), informative_multiple(solution.mixture, multiple)):
        try:
            results.append(count_neighbors(solution, rule))
        except NoAnswer as reason:
            missing.append(f"{rule.description}: {reason}")
    if not results:
        raise NoAnswer("; ".join(missing))
    ratios = np.array([result.neighbor_ratios for result in results])
    return ShellSensitivity(tuple(results), tuple(missing), np.ptp(ratios, axis=0))
