"""Where a mixture splits: the k = 0 limit of concentration fluctuations.

S_cc(0) = N <dx^2>; x1 x2/S_cc(0) = 1 + x1 d ln gamma_1/dx1 at constant temperature and pressure: 1 for an ideal
mixture, 0 at the spinodal (Bhatia and Thornton, Phys. Rev. B 2 (1970) 3004; Kirkwood and Buff 1951).
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from ozsolve import Mixture, Solution, State, solve

Array = NDArray[np.float64]

SCAN_POINTS = 2001


def inverse_concentration_fluctuations(solutions: Sequence[Solution]) -> Array:
    """x1 x2/S_cc(0) of two species; for more, the smallest eigenvalue of [X^-1/2 S_cc X^-1/2]^-1 on compositions.

    Finite at infinite dilution, where it is 1. Shape (len(solutions),); NaN for a failed state.
    """
    return np.array([_inverse_one(solution) for solution in solutions])


def _inverse_one(solution: Solution) -> float:
    if not solution.status.usable:
        return math.nan
    x = np.array(solution.state.mole_fractions)
    present = x > 0.0
    if present.sum() < 2:
        return 1.0
    root = np.sqrt(x[present])
    scaled = solution.concentration_structure_factor[np.ix_(present, present)] / np.outer(root, root)
    largest = float(np.linalg.eigvalsh(scaled)[-1])
    return 1.0 / largest


def sign_changes(fraction: Array, criterion: Array) -> list[float]:
    """Where a sampled stability criterion changes sign (linear between samples); NaN samples are left out.

    Parameters
    ----------
    fraction, criterion : ndarray, shape (m,)
    """
    good = np.isfinite(criterion)
    s, value = fraction[good], criterion[good]
    found = []
    for n in np.flatnonzero(value[:-1] * value[1:] < 0.0):
        found.append(float(s[n] - value[n] * (s[n + 1] - s[n]) / (value[n + 1] - value[n])))
    return found


def unstable_ranges(fraction: Array, criterion: Array) -> list[tuple[float, float]]:
    """Ranges where the criterion is negative, as (from, to)."""
    edges = sign_changes(fraction, criterion)
    good = np.isfinite(criterion)
    s, value = fraction[good], criterion[good]
    if len(s) == 0:
        return []
    if value[0] < 0.0:
        edges.insert(0, float(s[0]))
    if value[-1] < 0.0:
        edges.append(float(s[-1]))
    return list(zip(edges[::2], edges[1::2], strict=True))


def stability_criterion(x: Array, ln_gamma: Array) -> Array:
    """1 + x1 d ln gamma_1/dx1 of two species by differences along a fine scan; negative where ln gamma
    splits the liquid. For any source of ln gamma: a model or the closure.

    Parameters
    ----------
    x : ndarray, shape (m,)
        Mole fraction of the first species, rising, 0 < x < 1.
    ln_gamma : ndarray, shape (m, 2)
        Both are used: x1 x2 d[ln(x1 gamma_1/(x2 gamma_2))]/dx1, which needs no Gibbs-Duhem relation.
    """
    ratio = ln_gamma[:, 0] - ln_gamma[:, 1]
    return np.asarray(1.0 + x * (1.0 - x) * np.gradient(ratio, x, edge_order=2))


BISECTIONS = 7


def branch_ends(
    mixture: Mixture, temperature: float, eta: float, x: Array, good: NDArray[np.bool_], closure: str, accuracy: float
) -> list[tuple[float, float]]:
    """Composition ranges of two species without a solution of the closure, each found by bisection.

    Parameters
    ----------
    x : ndarray, shape (m,)
        Mole fractions of the first species that were tried, rising.
    good : ndarray of bool, shape (m,)
        Which of them have a solution.

    Returns
    -------
    list of (float, float)
        Last composition with a solution on either side, within the spacing of x over 2^7.
    """

    def solvable(fraction: float) -> bool:
        state = State(temperature, (fraction, 1.0 - fraction), packing_fraction=eta)
        return solve(mixture, state, closure=closure, accuracy=accuracy, on_failure="return").status.usable

    edges = []
    for n in np.flatnonzero(good[:-1] != good[1:]):
        inside, outside = (float(x[n]), float(x[n + 1])) if good[n] else (float(x[n + 1]), float(x[n]))
        for _ in range(BISECTIONS):
            middle = 0.5 * (inside + outside)
            inside, outside = (middle, outside) if solvable(middle) else (inside, middle)
        edges.append(inside)
    return list(zip(edges[::2], edges[1::2], strict=False))
