"""g = 0 in the core, and S(k) against c(k), by a second, plain evaluation of the Ornstein-Zernike relation.

Nothing here comes out of the engine but gamma(r): closure, transforms and matrices are those of
tests/plain_transform.py. A wrong gamma, or a right one under the wrong closure, does not give h = -1.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.interpolate import CubicSpline

from ozsolve import Mixture, Solution, State, solve
from tests.plain_transform import SPACING, PlainResult, forward, inverse, plain, step

STATES = {
    "one": (Mixture(1.0, 1.0), State(1.5, packing_fraction=0.40)),
    "hard": (Mixture([1.0, 2.0], [0.0, 0.0]), State(1.0, (0.9, 0.1), packing_fraction=0.40)),
    "two": (Mixture([1.0, 1.5], [1.0, 1.5], k=0.1), State(2.0, (0.5, 0.5), packing_fraction=0.40)),
    "three": (Mixture([1.0, 1.2, 1.6], [1.0, 0.8, 1.4]), State(2.0, (0.2, 0.3, 0.5), packing_fraction=0.38)),
}
CASES = [(name, closure) for name in STATES for closure in ("py", "msa", "hnc")]
SECOND_ORDER = 5e-4
"""What the plain sums leave at their spacing (0.0025); the engine's own grid is not the limit here."""


def check_core(solution: Solution, found: PlainResult) -> None:
    """h = -1 in the core, h = g - 1 outside; next to steps and the origin kinks cost digits."""
    for i, j in np.ndindex(found.h_r.shape[:2]):
        core = solution.mixture.pairs.diameter[i, j]
        inside = (found.r > 0.3) & (found.r < core - 0.05)
        beyond = (found.r > core + 0.05) & (found.r < 8.0)
        for window in (inside, beyond):
            assert np.max(np.abs(found.h_r[i, j] - (found.g_r[i, j] - 1.0))[window]) < SECOND_ORDER
        assert np.max(np.abs(found.h_r[i, j] + 1.0)[inside]) < SECOND_ORDER


def check_structure(solution: Solution, found: PlainResult) -> None:
    """S(k) = delta + sqrt(rho rho) h(k) from g(r), against [I - C(k)]^-1 of the solution; c(k) likewise."""
    window = (found.k > solution.k[1]) & (found.k < 20.0)
    root = np.sqrt(solution.densities)
    factors = np.eye(len(root))[:, :, None] + (root[:, None] * root)[:, :, None] * found.h_k
    for own, other in ((solution.structure_factors, factors), (solution.c_k, found.c_k)):
        at = CubicSpline(solution.k, own, axis=-1)(found.k[window])
        assert np.max(np.abs(at - other[:, :, window])) < SECOND_ORDER * np.abs(at).max()


@pytest.mark.parametrize(("name", "closure"), CASES)
def test_the_relation_gives_an_empty_core(name: str, closure: str) -> None:
    solution = solve(*STATES[name], closure=closure, accuracy=1e-9)
    found = plain(solution, closure)
    check_core(solution, found)
    check_structure(solution, found)
    wrong = plain(solution, "py" if closure == "hnc" else "hnc")
    for check in (check_core, check_structure):
        with pytest.raises(AssertionError):
            check(solution, wrong)


def test_the_plain_transform_knows_a_ball() -> None:
    """Indicator of r < 1: 4 pi (sin k - k cos k)/k^3 (common practice, no source)."""
    count = 8000
    index = np.arange(1, count)
    r, k = SPACING * index, np.pi / (count * SPACING) * index
    ball = forward(step(r, 1.0), r, k)
    low = k < 20.0
    assert np.max(np.abs(ball - 4.0 * np.pi * (np.sin(k) - k * np.cos(k)) / k**3)[low]) < 1e-4
    assert np.max(np.abs(inverse(ball, r, k) - step(r, 1.0))) < 1e-10
    whole = forward((r < 1.0 + SPACING / 2).astype(float), r, k)  # full weight on the step
    assert np.max(np.abs(whole - ball)[low]) > 1e-2
