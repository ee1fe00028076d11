"""Kirkwood-Buff identities against direct derivatives of closed forms, and sums over all k."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.optimize import brentq

from ozsolve import Mixture, Solution, State, solve
from ozsolve import reference as exact
from tests.readers import numbers, read

ROWS = [numbers(row) for row in read("kirkwood_buff_hs")]


def hard(row: dict[str, float], closure: str = "py", accuracy: float = 1e-7) -> Solution:
    state = State(1.0, (row["x1"], 1.0 - row["x1"]), packing_fraction=row["eta"])
    return solve(Mixture([1.0, row["ratio"]], [0.0, 0.0]), state, closure=closure, accuracy=accuracy)


def difference(function, step: float):
    """Central difference at 0 of fourth order."""
    near, far = function(step) - function(-step), function(2.0 * step) - function(-2.0 * step)
    return (8.0 * near - far) / (12.0 * step)


def excess_potentials(rho: np.ndarray, sigma: np.ndarray) -> np.ndarray:
    """beta mu_i without the ideal part: the free energy differentiated by rho_i."""
    total = rho.sum()
    return np.array(
        [difference(lambda t, e=e: exact.py_excess_free_energy(rho + t * e, sigma), 1e-4 * total) for e in np.eye(2)]
    )


def test_the_free_energy_gives_the_pressure_of_lebowitz() -> None:
    """beta P = sum rho_i (1 + beta mu_i,ex) - beta A_ex/V; its last digits are the differencing's."""
    for row in ROWS:
        sigma, x = np.array([1.0, row["ratio"]]), np.array([row["x1"], 1.0 - row["x1"]])
        rho = x * row["rho"]
        found = rho @ (1.0 + excess_potentials(rho, sigma)) - exact.py_excess_free_energy(rho, sigma)
        assert found == pytest.approx(exact.py_compressibility_pressure(rho, sigma), rel=1e-9)
        assert found != pytest.approx(exact.py_virial_pressure(rho, sigma), rel=1e-2)


def check_direct_correlations(row: dict[str, float], solution: Solution) -> None:
    """-c_ij(0) = d(beta mu_i,ex)/d rho_j (Kirkwood and Buff, J. Chem. Phys. 19 (1951) 774), with the free
    energy of Lebowitz (1964)."""
    rho, sigma = solution.densities, np.array([1.0, row["ratio"]])
    for j, e in enumerate(np.eye(2)):
        slope = difference(lambda t, e=e: excess_potentials(rho + t * e, sigma), 2e-3 * rho.sum())
        found = -solution.observables.c_zero[:, j] * solution.length**3
        assert np.max(np.abs(found / slope - 1.0)) < 1e-6


def check_constant_pressure(row: dict[str, float], solution: Solution) -> None:
    """d ln gamma_1/d x_1 at constant pressure and the partial volumes: from the integrals G_ij (Kirkwood and
    Buff 1951), and by moving along the isobar."""
    rho, sigma, x = solution.densities, np.array([1.0, row["ratio"]]), np.array(solution.state.mole_fractions)
    total, g = rho.sum(), solution.kirkwood_buff
    pressure = exact.py_compressibility_pressure(rho, sigma)

    def isobar(shift: float) -> np.ndarray:
        """Densities at x_1 + shift."""
        there = np.array([x[0] + shift, x[1] - shift])
        return there * brentq(
            lambda t: exact.py_compressibility_pressure(there * t, sigma) - pressure, 0.5 * total, 1.5 * total,
            xtol=1e-14, rtol=1e-14,
        )  # fmt: skip

    def log_gamma(shift: float) -> float:
        there = isobar(shift)
        return math.log(there.sum()) + float(excess_potentials(there, sigma)[0])

    d = g[0, 0] + g[1, 1] - 2.0 * g[0, 1]
    direct = difference(log_gamma, 1e-3)
    assert -x[1] * total * d / (1.0 + x[0] * x[1] * total * d) == pytest.approx(direct, rel=1e-6)
    assert direct == pytest.approx(row["dlng1_dx1"], rel=1e-6)
    volume, slope = 1.0 / total, difference(lambda t: 1.0 / isobar(t).sum(), 1e-3)
    common = total + rho[0] * rho[1] * d
    for i, (partial, name) in enumerate(((volume + x[1] * slope, "V1"), (volume - x[0] * slope, "V2"))):
        assert (1.0 + rho[1 - i] * (g[1 - i, 1 - i] - g[0, 1])) / common == pytest.approx(partial, rel=1e-6)
        assert partial == pytest.approx(row[name], rel=1e-6)


@pytest.mark.parametrize("check", [check_direct_correlations, check_constant_pressure])
@pytest.mark.parametrize("row", ROWS, ids=lambda r: f"{r['ratio']}-{r['x1']}")
def test_kirkwood_buff_against_direct_derivatives(row: dict[str, float], check) -> None:
    check(row, hard(row))
    with pytest.raises(AssertionError):
        check(row, hard(row, "hnc"))
    with pytest.raises(AssertionError):
        check({**row, "ratio": 1.001 * row["ratio"]}, hard(row))


def check_structure(row: dict[str, float], solution: Solution) -> None:
    """S_ij(k) against Baxter's factor (J. Chem. Phys. 52 (1970) 4559; Lebowitz (1964) for its coefficients)."""
    low = solution.k < 30.0
    matrix = exact.py_stability_matrix(solution.k[low], solution.densities, np.array([1.0, row["ratio"]]))
    found = np.moveaxis(solution.structure_factors, -1, 0)[low]
    assert np.max(np.abs(found - np.linalg.inv(matrix))) < 1e-7


@pytest.mark.parametrize("row", ROWS, ids=lambda r: f"{r['ratio']}-{r['x1']}")
def test_structure_factors_at_every_k(row: dict[str, float]) -> None:
    check_structure(row, hard(row))
    with pytest.raises(AssertionError):
        check_structure(row, hard(row, "hnc"))
    with pytest.raises(AssertionError):
        check_structure({**row, "ratio": 1.001 * row["ratio"]}, hard(row))


def logarithm_sum(solution: Solution, tail: bool = True) -> float:
    """int [ln det(I - C) + tr C] d3k/(2 pi)^3 over all k.

    Summed to half of the largest k; beyond, -tr C^2/2 with c_ij(k) -> (4 pi/k^2) sum over steps of (radius)
    (jump of c) cos(k radius), its cosines averaged.
    """
    rho, pairs = solution.densities, solution.mixture.pairs
    root = np.sqrt(rho)
    c = np.moveaxis(solution.c_k, -1, 0) * root[:, None] * root
    integrand = np.linalg.slogdet(np.eye(len(rho)) - c)[1] + np.trace(c, axis1=1, axis2=2)
    count, step = len(solution.k) // 2, solution.k[0]
    total = float(np.sum((integrand * solution.k**2)[:count]) * step / (2.0 * math.pi**2))
    inside, outside = solution.edge_values
    jumps = (pairs.diameter * solution.contact_values) ** 2 + (pairs.well_edge * (outside - inside)) ** 2
    beyond = -2.0 * float(rho @ jumps @ rho) / (solution.k[count - 1] + 0.5 * step)
    return total + beyond if tail else total


def check_pressure_from_all_k(solution: Solution, tail: bool = True) -> None:
    """beta P = rho - sum rho_i rho_j c_ij(0) + int [ln det(I - C) + tr C] d3k/(2 pi)^3 for Percus-Yevick hard
    spheres (own derivation: differentiate by the density, use h = -1 in the core, c = 0 beyond, and
    -c(r = 0) = d(beta P)/d rho), against the pressure of Lebowitz (1964)."""
    rho = solution.densities
    zero = float(rho @ (solution.observables.c_zero * solution.length**3) @ rho)
    found = rho.sum() - zero + logarithm_sum(solution, tail)
    closed = exact.py_compressibility_pressure(rho, solution.mixture.diameter)
    assert found == pytest.approx(closed, rel=1e-5)


@pytest.mark.parametrize("eta", [0.1, 0.3, 0.45])
def test_sum_over_all_k_gives_the_pressure(eta: float) -> None:
    state = State(1.0, packing_fraction=eta)
    solution = solve(Mixture(1.0, 0.0), state, closure="py", accuracy=1e-9)
    check_pressure_from_all_k(solution)
    with pytest.raises(AssertionError):
        check_pressure_from_all_k(solution, tail=False)
    with pytest.raises(AssertionError):
        check_pressure_from_all_k(solve(Mixture(1.0, 0.0), state, closure="hnc", accuracy=1e-9))


@pytest.mark.parametrize("row", ROWS, ids=lambda r: f"{r['ratio']}-{r['x1']}")
def test_sum_over_all_k_gives_the_pressure_of_mixtures(row: dict[str, float]) -> None:
    check_pressure_from_all_k(hard(row, accuracy=1e-9))


def check_mean_spherical_slope(closure: str, density: float) -> None:
    """d/d rho {int [ln(1 - rho c) + rho c] d3k/2 (2 pi)^3 - rho^2 c(k = 0)/2} = -gamma(r = 0)/2 - rho c(k = 0)
    when c does not depend on the density beyond the core and h = -1 inside: true of MSA wells, not of other
    closures (own derivation, as above)."""

    def at(rho: float) -> Solution:
        return solve(Mixture(1.0, 1.0), State(1.5, density=rho), closure=closure, accuracy=1e-9)

    def functional(shift: float) -> float:
        solution = at(density + shift)
        zero = float(solution.observables.c_zero[0, 0])
        return 0.5 * logarithm_sum(solution) - 0.5 * (density + shift) ** 2 * zero

    here = at(density)
    near = (here.r > 0.08) & (here.r < 0.22)
    origin = float(np.polynomial.Polynomial.fit(here.r[near], here.gamma_r[0, 0][near], 3)(0.0))
    expected = -0.5 * origin - density * float(here.observables.c_zero[0, 0])
    assert difference(functional, 1e-3 * density) == pytest.approx(expected, rel=1e-3)


@pytest.mark.parametrize("density", [0.3, 0.7])
def test_density_derivative_of_the_sum_over_all_k(density: float) -> None:
    check_mean_spherical_slope("msa", density)
    with pytest.raises(AssertionError):
        check_mean_spherical_slope("py", density)
