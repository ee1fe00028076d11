"""Neighbour counts, shell rules, and what models state about them."""

from __future__ import annotations

from types import SimpleNamespace
from typing import cast

import numpy as np
import pytest

from localcomp.errors import NoAnswer
from localcomp.models import TABLE_MODELS, ModelInput, Nrtl, QuasiChemical, Wilson, compare
from localcomp.models.base import BOTH
from localcomp.models.quasichemical import contact_factors
from localcomp.neighbors import count_neighbors, shell_sensitivity
from localcomp.shells import FirstMinimum, FixedMultiple, WellEdge
from ozsolve import CLOSURES, Mixture, Solution, State, solve
from tests.problems import PROBLEMS
from tests.readers import numbers, read

RULES = [WellEdge(), FirstMinimum(), FixedMultiple(1.4)]


def solution(closure: str = "rhnc", name: str = "unlike"):
    return solve(*PROBLEMS[name], closure=closure)


def check_reciprocity(x: np.ndarray, counts: np.ndarray) -> None:
    pairs = x[:, None] * counts
    assert np.max(np.abs(pairs / pairs.T - 1.0)) < 1e-9


@pytest.mark.parametrize("rule", RULES, ids=lambda r: r.name)
@pytest.mark.parametrize("name", ["equal sizes", "unlike", "ternary", "shoulder"])
def test_pair_counts_are_reciprocal(name: str, rule) -> None:
    """x_i N_ij = x_j N_ji: the same pairs counted from both ends."""
    found = count_neighbors(solution(name=name), rule)
    x = np.array(PROBLEMS[name][1].mole_fractions)
    check_reciprocity(x, found.coordination_numbers)
    with pytest.raises(AssertionError):
        check_reciprocity(x * np.linspace(1.0, 1.001, len(x)), found.coordination_numbers)


def test_definitions() -> None:
    found = count_neighbors(solution())
    counts, x = found.coordination_numbers, np.array([0.5, 0.5])
    assert np.max(np.abs(found.local_mole_fractions.sum(axis=1) - 1.0)) < 1e-14
    assert found.local_mole_fractions[0, 1] == pytest.approx(counts[0, 1] / counts[0].sum())
    expected = (counts / np.diag(counts)[:, None]) / (x[None, :] / x[:, None])
    assert np.max(np.abs(found.neighbor_ratios / expected - 1.0)) < 1e-12
    assert np.all(found.coordination_errors > 0.0)


@pytest.mark.parametrize("closure", list(CLOSURES))
def test_identical_species_do_not_care(closure: str) -> None:
    twins = solve(Mixture([1.0, 1.0], [1.0, 1.0]), State(1.5, (0.2, 0.8), packing_fraction=0.4), closure=closure)
    assert np.max(np.abs(count_neighbors(twins).neighbor_ratios - 1.0)) < 1e-10


def test_infinite_dilution_has_ratios() -> None:
    dilute = solve(PROBLEMS["unlike"][0], State(2.0, (0.0, 1.0), packing_fraction=0.4))
    found = count_neighbors(dilute)
    assert found.coordination_numbers[0, 0] == 0.0
    near = count_neighbors(solve(PROBLEMS["unlike"][0], State(2.0, (1e-6, 1.0 - 1e-6), packing_fraction=0.4)))
    assert np.max(np.abs(found.neighbor_ratios / near.neighbor_ratios - 1.0)) < 1e-4


def test_shell_radii() -> None:
    s = solution()
    assert np.array_equal(WellEdge().radius(s), s.mixture.pairs.well_edge)
    assert np.allclose(FixedMultiple(1.4).radius(s), 1.4 * s.mixture.pairs.diameter)
    radius = FirstMinimum().radius(s)
    for i in range(2):
        for j in range(2):
            around = np.abs(s.r - radius[i, j]) < 0.12
            r, g = s.r[around], s.g_r[i, j][around]
            if abs(radius[i, j] - s.mixture.pairs.well_edge[i, j]) < 1e-12:  # a step down, then a rise
                assert g[r < radius[i, j]].min() > g[r > radius[i, j]].max()
            else:
                assert abs(r[np.argmin(g)] - radius[i, j]) < 0.03
                assert g[0] > g.min() < g[-1]


def test_first_minimum_of_hard_spheres() -> None:
    """Near 1.5 to 1.6 diameters at eta = 0.45 (table of PY hard spheres: g(1.5) below g(1.25) and g(1.75))."""
    s = solve(Mixture(1.0, 0.0), State(1.0, packing_fraction=0.45), closure="py")
    assert 1.45 < FirstMinimum().radius(s)[0, 0] < 1.65


def test_a_shell_that_does_not_exist_is_said_so() -> None:
    """A g(r) that only falls, made up: there is no minimum to find."""
    r = np.linspace(0.01, 6.0, 600)
    falling = SimpleNamespace(
        mixture=SimpleNamespace(
            species=1, pairs=SimpleNamespace(diameter=np.array([[1.0]]), well_edge=np.array([[1.5]]))
        ),
        r=r,
        g_r=np.where(r < 1.0, 0.0, 1.0 + np.exp(-r))[None, None],
        g_segments=lambda *, rough: (r, (1.0 + np.exp(-r))[None, None], (1.0 + np.exp(-r))[None, None]),
    )
    with pytest.raises(NoAnswer, match="no minimum"):
        FirstMinimum().radius(cast(Solution, falling))


def test_sensitivity_is_the_spread_over_rules() -> None:
    found = shell_sensitivity(solution())
    ratios = np.array([r.neighbor_ratios for r in found.results])
    assert len(found.results) == 3
    assert np.allclose(found.spread, ratios.max(axis=0) - ratios.min(axis=0))
    assert found.spread[0, 1] > 0.01


def test_a_failed_solution_has_no_neighbours() -> None:
    cold = solve(
        Mixture([1.0, 1.0], [1.0, 1.0], k=0.2), State(1.0, (0.5, 0.5), packing_fraction=0.4), closure="py",
        on_failure="return",
    )  # fmt: skip
    with pytest.raises(NoAnswer, match="branch"):
        count_neighbors(cold)


GIVEN = ModelInput(np.array([[0.5, 0.7], [0.7, 1.2]]), np.array([1.0, 1.5]), np.array([0.3, 0.7]))


def test_wilson_and_nrtl_statements() -> None:
    """Wilson, J. Am. Chem. Soc. 86 (1964) 127; Renon and Prausnitz, AIChE J. 14 (1968) 135."""
    one, all_contacts = BOTH
    assert Wilson().ratios(GIVEN, one)[0, 1] == pytest.approx(np.exp(0.2))
    assert Wilson().ratios(GIVEN, all_contacts)[1, 0] == pytest.approx(np.exp(5 * -0.5))
    assert Nrtl(0.3).ratios(GIVEN, one)[0, 1] == pytest.approx(np.exp(0.06))
    assert Wilson().ratios(GIVEN, one)[0, 1] != pytest.approx(np.exp(-0.2))  # the sign matters


def quasi_chemical_pairs(x: float, w_over_zkt: float) -> float:
    """Fraction of neighbours of a 1 that are 2, from our own R_12, equal sizes."""
    depth = np.array([[0.0, -w_over_zkt], [-w_over_zkt, 0.0]])
    ratio = QuasiChemical().ratios(ModelInput(depth, np.ones(2), np.array([x, 1 - x])), BOTH[0])[0, 1]
    return float(ratio * (1 - x) / (x + ratio * (1 - x)))


@pytest.mark.parametrize("x", [0.1, 0.3, 0.5, 0.9])
@pytest.mark.parametrize("strength", [-0.4, 0.1, 0.3])
def test_quasi_chemical_against_its_closed_form(x: float, strength: float) -> None:
    """Guggenheim, Mixtures (1952): neighbours of a 1 that are 2 = 2 x2/(B + 1),
    B = sqrt(1 + 4 x1 x2 (exp(2 w/zkT) - 1))."""
    b = np.sqrt(1.0 + 4.0 * x * (1 - x) * np.expm1(2.0 * strength))
    assert quasi_chemical_pairs(x, strength) == pytest.approx(2.0 * (1 - x) / (b + 1.0), rel=1e-10)
    assert quasi_chemical_pairs(x, -strength) != pytest.approx(2.0 * (1 - x) / (b + 1.0), rel=1e-3)


def test_quasi_chemical_invariant() -> None:
    """R_12 R_21 = exp[beta (2 eps_12 - eps_11 - eps_22)], whatever composition and sizes."""
    for x in (0.05, 0.5, 0.95):
        for size in (1.0, 2.0):
            given = ModelInput(GIVEN.reduced_depth, np.array([1.0, size]), np.array([x, 1 - x]))
            ratios = QuasiChemical().ratios(given, BOTH[0])
            assert ratios[0, 1] * ratios[1, 0] == pytest.approx(np.exp(2 * 0.7 - 0.5 - 1.2), rel=1e-10)


def test_quasi_chemical_pair_balance_for_three_species() -> None:
    rng = np.random.default_rng(6)
    depth = rng.uniform(0.0, 1.0, (3, 3))
    depth = 0.5 * (depth + depth.T)
    half = 0.5 * np.diag(depth)
    boltzmann = np.exp(depth - half[:, None] - half[None, :])
    theta = np.array([0.2, 0.3, 0.5])
    g = contact_factors(theta, boltzmann)
    assert np.max(np.abs(g * (boltzmann @ (theta * g)) - 1.0)) < 1e-12


def test_the_comparison_shows_both_readings_and_the_factor() -> None:
    found = count_neighbors(solution()).neighbor_ratios
    table = compare(found, ModelInput.of(*PROBLEMS["unlike"]), TABLE_MODELS)
    assert [s.contacts for s in table] == [1.0, 5.0, 1.0, 5.0, 1.0, 5.0]
    for s in table:
        assert np.allclose(s.off * found, s.stated)
        assert np.allclose(np.diag(s.stated), 1.0)
        assert s.model.source


def test_outside_numbers_are_readable() -> None:
    assert numbers(read("hs_py_gr")[0])["eta"] == 0.1
