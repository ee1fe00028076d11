"""Kirkwood-Buff integrals, structure factors, transforms: identities and tabulated values."""

from __future__ import annotations

import math

import numpy as np
import pytest

from ozsolve import CLOSURES, Mixture, Solution, State, solve
from ozsolve import reference as exact
from ozsolve.grid import Grid
from ozsolve.oz import indirect, indirect_response, lowest_eigenvalue, pair_index, smallest_pivot
from ozsolve.transform import RadialTransform
from tests.problems import PROBLEMS
from tests.readers import numbers, read

KIRKWOOD_BUFF = [numbers(row) for row in read("kirkwood_buff_hs")]


def hard(row: dict[str, float], closure: str = "py") -> Solution:
    state = State(1.0, (row["x1"], 1.0 - row["x1"]), packing_fraction=row["eta"])
    return solve(Mixture([1.0, row["ratio"]], [0.0, 0.0]), state, closure=closure, accuracy=1e-7)


def check_kirkwood_buff(row: dict[str, float], solution: Solution) -> None:
    """Kirkwood and Buff, J. Chem. Phys. 19 (1951) 774, with PY hard spheres (verified by differentiation)."""
    found = solution.kirkwood_buff
    for name, (i, j) in {"G11": (0, 0), "G12": (0, 1), "G22": (1, 1)}.items():
        assert found[i, j] == pytest.approx(row[name], rel=1e-5)
    rho = solution.densities
    difference = found[0, 0] + found[1, 1] - 2.0 * found[0, 1]
    common = rho.sum() + rho[0] * rho[1] * difference
    zeta = 1.0 + rho @ np.diag(found) + rho[0] * rho[1] * (found[0, 0] * found[1, 1] - found[0, 1] ** 2)
    assert zeta / common == pytest.approx(row["kT_kappaT"], rel=1e-5)
    assert (1.0 + rho[1] * (found[1, 1] - found[0, 1])) / common == pytest.approx(row["V1"], rel=1e-5)
    # Bhatia and Thornton, Phys. Rev. B 2 (1970) 3004 (memory): S_cc(0) = x1 x2 (1 + x1 x2 rho D)
    assert solution.concentration_structure_factor[0, 0] == pytest.approx(row["Scc0"], rel=1e-5)


@pytest.mark.parametrize("row", KIRKWOOD_BUFF, ids=lambda r: str(r["ratio"]))
def test_kirkwood_buff_integrals(row: dict[str, float]) -> None:
    check_kirkwood_buff(row, hard(row))
    with pytest.raises(AssertionError):
        check_kirkwood_buff(row, hard(row, "hnc"))


@pytest.mark.parametrize("row", KIRKWOOD_BUFF, ids=lambda r: str(r["ratio"]))
def test_c_zero_is_the_derivative_of_the_pressure(row: dict[str, float]) -> None:
    """d(beta P)/d rho_i = 1 - sum_j rho_j c_ij(0), the pressure of Lebowitz (1964) differenced."""
    solution = hard(row)
    rho, sigma = solution.densities, np.array([1.0, row["ratio"]])
    found = 1.0 - solution.observables.c_zero @ rho
    for i in range(2):
        step = np.zeros(2)
        step[i] = 1e-5 * rho.sum()
        pressures = [exact.py_compressibility_pressure(rho + sign * step, sigma) for sign in (1.0, -1.0)]
        slope = (pressures[0] - pressures[1]) / (2e-5 * rho.sum())
        assert found[i] == pytest.approx(slope, rel=1e-5)
        assert 2.0 - found[i] != pytest.approx(slope, rel=1e-5), "the sign of c must show"


@pytest.mark.parametrize("name", list(PROBLEMS))
def test_structure_factors_invert_i_minus_c(name: str) -> None:
    """S(k) = [I - C(k)]^-1 (Hansen and McDonald, Theory of Simple Liquids (2006), chapter 3)."""
    mixture, state = PROBLEMS[name]
    solution = solve(mixture, state)
    root = np.sqrt(solution.densities)
    c_k = np.moveaxis(solution.c_k, -1, 0)
    product = (np.eye(len(root)) - root[:, None] * root * c_k) @ np.moveaxis(solution.structure_factors, -1, 0)
    assert np.max(np.abs(product - np.eye(len(root)))) < 1e-10
    wrong = (np.eye(len(root)) + root[:, None] * root * c_k) @ np.moveaxis(solution.structure_factors, -1, 0)
    assert np.max(np.abs(wrong - np.eye(len(root)))) > 1e-2, "the sign of c must show"
    g_zero = solution.kirkwood_buff
    expected = np.eye(len(root)) + root[:, None] * root * g_zero
    k, beginning = solution.k[:6], solution.structure_factors[:, :, :6].reshape(-1, 6)
    even = np.polynomial.Polynomial  # S(k) is even in k: a polynomial in k^2
    at_zero = np.array([even.fit(k**2, row, 4)(0.0) for row in beginning]).reshape(expected.shape)
    assert np.max(np.abs(at_zero - expected)) < 2e-3 * np.abs(expected).max()
    assert solution.lowest_eigenvalue > 0.0


@pytest.mark.parametrize("name", list(PROBLEMS))
def test_sum_over_all_k_gives_gamma_at_the_origin(name: str) -> None:
    """gamma(0) = (1/2 pi^2) int gamma(k) k^2 dk against gamma extrapolated to r = 0, and
    4 pi int gamma^2 r^2 dr = (1/2 pi^2) int gamma(k)^2 k^2 dk (Parseval)."""
    mixture, state = PROBLEMS[name]
    solution = solve(mixture, state, accuracy=1e-6)
    sums = []
    for level in (solution.coarse, solution.fine):
        assert level is not None
        equations, grid = level.equations, level.grid
        gamma_r = equations.gamma(level.x)[0]
        gamma_k = indirect(equations.direct_k(level.x), equations.root_rho)[0][0] * grid.filter
        sums.append(np.sum(gamma_k * grid.k**2, axis=-1) * grid.k[0] / (2.0 * math.pi**2))
        in_r = 4.0 * math.pi * grid.spacing * np.sum((gamma_r * grid.r) ** 2, axis=-1)
        in_k = np.sum((gamma_k * grid.k) ** 2, axis=-1) * grid.k[0] / (2.0 * math.pi**2)
        assert np.max(np.abs(in_k / in_r - 1.0)) < 1e-6
        assert np.max(np.abs(2.0 * in_k / in_r - 1.0)) > 1e-6  # the check can fail
    near = (grid.r > 0.08) & (grid.r < 0.22)  # beyond the origin's rounding, before the first kink of gamma
    extrapolated = np.array([np.polynomial.Polynomial.fit(grid.r[near], row[near], 3)(0.0) for row in gamma_r])
    at_zero = 2.0 * sums[1] - sums[0]  # the sum misses a tail in proportion to the spacing
    i, j = np.triu_indices(mixture.species)
    like = i == j  # unlike pairs have kinks at |sigma_i - sigma_j|/2 too, close to the origin
    assert np.max(np.abs(at_zero / extrapolated - 1.0)[like]) < 1e-3
    assert np.max(np.abs(sums[0] / extrapolated - 1.0)[like]) > 1e-3


def test_known_transform_pair_and_round_trip() -> None:
    """exp(-r^2) <-> pi^(3/2) exp(-k^2/4)."""
    grid = Grid(0.05, 256)
    transform = RadialTransform(0.05, 256, 1)
    f_k = transform.forward((grid.r * np.exp(-(grid.r**2)))[None])[0]
    assert np.max(np.abs(f_k - math.pi**1.5 * np.exp(-(grid.k**2) / 4.0))) < 1e-13
    back = transform.inverse(f_k[None])[0] / grid.r
    assert np.max(np.abs(back - np.exp(-(grid.r**2)))) < 1e-6  # the filter's effect on a narrow Gaussian
    assert np.max(np.abs(f_k - math.pi**1.5 * np.exp(-(grid.k**2) / 3.9))) > 1e-3


@pytest.mark.parametrize("species", [1, 2, 3, 4])
def test_oz_relation_against_direct_inversion(species: int) -> None:
    """h = c + c rho h at every k, with numpy's inverse; positive definiteness against eigenvalues."""
    rng = np.random.default_rng(11 + species)
    pairs = species * (species + 1) // 2
    c_k = rng.normal(size=(3, pairs, 7)) - 1.0
    rho = rng.uniform(0.0, 0.4, (3, species))
    rho[0, 0] = 0.0  # infinite dilution is no special case
    gamma, pivots = indirect(c_k, np.sqrt(rho))
    index = np.array(pair_index(species))
    lowest = lowest_eigenvalue(c_k, np.sqrt(rho))
    for b in range(3):
        for m in range(7):
            c = c_k[b][index, m]
            h = np.linalg.solve(np.eye(species) - c * rho[b], c)
            assert np.max(np.abs(gamma[b][index, m] - (h - c))) < 1e-9 * max(1.0, np.abs(h).max())
        assert (smallest_pivot(pivots)[b] > 0.0) == (lowest[b] > 0.0)


@pytest.mark.parametrize("species", [1, 2, 3])
def test_linear_response_of_the_oz_relation(species: int) -> None:
    rng = np.random.default_rng(5)
    pairs = species * (species + 1) // 2
    c_k = rng.normal(size=(1, pairs, 5)) - 2.0
    rho = rng.uniform(0.05, 0.3, (1, species))
    change = rng.normal(size=c_k.shape)
    step = 1e-6
    ends = [indirect(c_k + sign * step * change, np.sqrt(rho))[0] for sign in (1.0, -1.0)]
    gamma, _ = indirect(c_k, np.sqrt(rho))
    found = indirect_response(c_k + gamma, rho, change)
    assert np.max(np.abs(found - (ends[0] - ends[1]) / (2 * step))) < 1e-6 * np.abs(found).max()


@pytest.mark.parametrize("closure", list(CLOSURES))
def test_energy_is_the_sum_over_neighbour_counts(closure: str) -> None:
    mixture, state = PROBLEMS["unlike"]
    solution = solve(mixture, state, closure=closure)
    counts = solution.densities * solution.observables.shell_integral
    x = np.array(state.mole_fractions)
    assert solution.internal_energy == pytest.approx(-0.5 * np.sum(x[:, None] * counts * mixture.pairs.well_depth))
    turned = -0.5 * np.sum(x[:, None] * counts * mixture.pairs.well_depth[::-1, ::-1])
    assert solution.internal_energy != pytest.approx(turned), "swapped wells must show"
