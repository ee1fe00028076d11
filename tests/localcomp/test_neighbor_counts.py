"""Neighbour counts over every closure and shell rule, against outside numbers, and at the edges."""

from __future__ import annotations

import numpy as np
import pytest

from localcomp.errors import NoAnswer
from localcomp.neighbors import count_neighbors, shell_sensitivity
from localcomp.shells import FirstMinimum, FixedMultiple, WellEdge
from ozsolve import CLOSURES, Mixture, PairOverride, Solution, State, solve
from tests.readers import read

RECIPROCITY = 1e-9
RULES = (WellEdge(), FirstMinimum(), FixedMultiple(1.4))

BINARY = Mixture([1.0, 1.5], [1.0, 1.5], k=0.1)
TERNARY = Mixture([1.0, 1.2, 1.6], [1.0, 0.7, 0.0], [1.5, 1.6, 1.5], k=0.1, l=0.02)
SHOULDER = Mixture([1.0, 1.1], [1.0, -0.5], overrides=[PairOverride(0, 1, well_depth=0.4)])
FLUIDS = {
    "binary": (BINARY, State(2.0, (0.3, 0.7), packing_fraction=0.40)),
    "ternary": (TERNARY, State(2.0, (0.2, 0.5, 0.3), packing_fraction=0.38)),
    "shoulder": (SHOULDER, State(2.0, (0.6, 0.4), packing_fraction=0.35)),
}


@pytest.fixture(scope="module")
def solved() -> dict[tuple[str, str], Solution]:
    return {(fluid, name): solve(*FLUIDS[fluid], closure=name) for fluid in FLUIDS for name in CLOSURES}


def reciprocity_gap(x: np.ndarray, counts: np.ndarray) -> float:
    """Largest relative difference of x_i N_ij and x_j N_ji: both count the same pairs."""
    pairs = x[:, None] * counts
    return float(np.max(np.abs(pairs - pairs.T) / pairs))


@pytest.mark.parametrize("rule", RULES, ids=lambda rule: rule.name)
@pytest.mark.parametrize("closure", CLOSURES)
@pytest.mark.parametrize("fluid", FLUIDS)
def test_pairs_are_counted_alike_from_both_ends(fluid, closure, rule, solved):
    solution = solved[fluid, closure]
    found = count_neighbors(solution, rule)
    x = np.array(solution.state.mole_fractions)
    assert reciprocity_gap(x, found.coordination_numbers) < RECIPROCITY
    assert found.local_mole_fractions.sum(axis=1) == pytest.approx(1.0, abs=1e-13)
    n = found.coordination_numbers
    ratio = (n / np.diag(n)[:, None]) / (x[None, :] / x[:, None])
    assert found.neighbor_ratios == pytest.approx(ratio, rel=1e-12)
    for bars in (found.coordination_errors, found.fraction_errors, found.ratio_errors):
        assert np.all(bars >= 0.0)
        # a first minimum can be flat, and its radius then uncertain
        assert np.all(bars < (0.05 if rule.name == "first_minimum" else 1e-3))


def test_lopsided_shells_are_caught_by_the_reciprocity_check(solved):
    solution = solved["binary", "rhnc"]
    integral = [solution.shell_integral(np.full((2, 2), radius))[0] for radius in (1.875, 1.877)]
    counts = solution.densities[None, :] * integral[0]
    counts[0, 1] = solution.densities[1] * integral[1][0, 1]
    assert reciprocity_gap(np.array([0.3, 0.7]), counts) > 1e-4


@pytest.mark.parametrize("rule", RULES, ids=lambda rule: rule.name)
@pytest.mark.parametrize("closure", CLOSURES)
def test_identical_species_do_not_care(closure, rule):
    same = Mixture([1.0, 1.0], [1.0, 1.0])
    found = count_neighbors(solve(same, State(1.5, (0.2, 0.8), packing_fraction=0.4), closure=closure), rule)
    assert found.neighbor_ratios == pytest.approx(1.0, abs=1e-10)
    assert found.local_mole_fractions == pytest.approx(np.array([[0.2, 0.8], [0.2, 0.8]]), abs=1e-10)


def test_species_that_differ_do_care():
    weak = Mixture([1.0, 1.0], [1.0, 1.0], k=0.1)
    found = count_neighbors(solve(weak, State(1.5, (0.2, 0.8), packing_fraction=0.4)))
    assert found.neighbor_ratios[0, 1] < 0.95


def test_a_fraction_of_exactly_zero_is_the_dilute_limit():
    dilute = count_neighbors(solve(BINARY, State(2.0, (0.0, 1.0), packing_fraction=0.4), accuracy=1e-7))
    nearly = count_neighbors(solve(BINARY, State(2.0, (1e-9, 1.0 - 1e-9), packing_fraction=0.4), accuracy=1e-7))
    assert np.array_equal(dilute.coordination_numbers[:, 0], [0.0, 0.0])
    assert np.array_equal(dilute.local_mole_fractions, [[0.0, 1.0], [0.0, 1.0]])
    assert dilute.coordination_numbers[:, 1] == pytest.approx(nearly.coordination_numbers[:, 1], rel=1e-7)
    assert dilute.neighbor_ratios == pytest.approx(nearly.neighbor_ratios, rel=1e-6)
    assert nearly.neighbor_ratios[0, 1] != pytest.approx(1.0, rel=0.1)


def hard_sphere_counts() -> list[tuple[float, float, float]]:
    rows = read("hs_py_coordination")
    return [(float(row["rho"]), lam, float(row[f"n_{lam}"])) for row in rows for lam in (1.25, 1.5, 1.75, 2.0)]


LAST_DIGIT = 5e-6
TABLE_DIGITS = 3e-6
"""Relative accuracy of the tabulated counts (an inversion of g good to 1e-5)."""


def misses(rho: float, lam: float, expected: float, closure: str) -> bool:
    """Whether our count is off by more than its own error bar and the table's."""
    solution = solve(Mixture(1.0, 0.0), State(1.0, density=rho), closure=closure, accuracy=1e-7)
    found = count_neighbors(solution, FixedMultiple(lam))
    bar = float(found.coordination_errors[0, 0]) + LAST_DIGIT + TABLE_DIGITS * expected
    return abs(float(found.coordination_numbers[0, 0]) - expected) > bar


@pytest.mark.parametrize(("rho", "lam", "expected"), hard_sphere_counts())
def test_neighbours_of_a_hard_sphere(rho, lam, expected):
    """Percus-Yevick hard spheres (Wertheim, Phys. Rev. Lett. 10 (1963) 321; Baxter, Aust. J. Phys. 21 (1968) 563),
    by Fourier inversion of the exact factor (tests/data)."""
    assert not misses(rho, lam, expected, "py")
    assert misses(rho, lam, expected, "hnc"), "another closure must fail this"


def test_sensitivity_to_the_rule(solved):
    solution = solved["binary", "rhnc"]
    sensitivity = shell_sensitivity(solution, 1.3)
    assert [found.rule for found in sensitivity.results] == [WellEdge(), FirstMinimum(), FixedMultiple(1.3)]
    assert sensitivity.missing == ()
    ratios = np.array([count_neighbors(solution, r).neighbor_ratios for r in (WellEdge(), FirstMinimum())])
    assert np.all(sensitivity.spread >= np.abs(ratios[0] - ratios[1]) - 1e-15)
    assert np.array_equal(np.diag(sensitivity.spread), [0.0, 0.0])


def test_a_failed_solution_has_no_neighbours():
    failed = solve(
        Mixture([1.0, 1.0], [1.0, 1.0], k=0.2),
        State(1.0, (0.5, 0.5), packing_fraction=0.4),
        closure="py",
        on_failure="return",
    )
    with pytest.raises(NoAnswer, match="branch"):
        count_neighbors(failed)
    with pytest.raises(NoAnswer, match="branch"):
        shell_sensitivity(failed)


def test_a_shell_nobody_can_enter_has_no_ratio():
    wall = solve(Mixture([1.0, 1.0], [-1000.0, -1000.0]), State(1.0, (0.5, 0.5), packing_fraction=0.05))
    with pytest.raises(NoAnswer, match="another shell rule"):
        count_neighbors(wall)
    assert count_neighbors(wall, FixedMultiple(2.0)).neighbor_ratios == pytest.approx(1.0, abs=1e-9)


def test_results_are_read_only(solved):
    found = count_neighbors(solved["binary", "rhnc"])
    with pytest.raises(ValueError, match="read-only"):
        found.neighbor_ratios[0, 1] = 1.0
