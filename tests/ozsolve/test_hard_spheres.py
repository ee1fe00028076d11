"""Percus-Yevick hard spheres against their closed forms."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.interpolate import CubicSpline

from ozsolve import Mixture, Solution, State, solve
from ozsolve import reference as exact
from tests.readers import numbers, read

MIXTURES = [numbers(row) for row in read("hs_mixture_py_bmcsl")]
PURE = [numbers(row) for row in read("hs_py_gr")]
COORDINATION = [numbers(row) for row in read("hs_py_coordination")]
DIGITS = 3e-8
"""The table's contact values have eight digits."""


def solved(row: dict[str, float], accuracy: float = 1e-5, closure: str = "py", swap: bool = False) -> Solution:
    sigma = [row["ratio"], 1.0] if swap else [1.0, row["ratio"]]
    state = State(1.0, (row["x1"], 1.0 - row["x1"]), packing_fraction=row["eta"])
    return solve(Mixture(sigma, [0.0, 0.0]), state, closure=closure, accuracy=accuracy)


def check_contact(row: dict[str, float], solution: Solution, tolerance: float) -> None:
    """Lebowitz, Phys. Rev. 133 (1964) A895, contact values: closed form, and the tabulated digits."""
    rho, sigma = solution.densities, np.array([1.0, row["ratio"]])
    closed = exact.py_contact_values(rho, sigma)
    assert np.max(np.abs(solution.contact_values / closed - 1.0)) < tolerance
    table = np.array([[row["g11_PY"], row["g12_PY"]], [row["g12_PY"], row["g22_PY"]]])
    assert np.max(np.abs(solution.contact_values / table - 1.0)) < tolerance + DIGITS


def check_compressibility(row: dict[str, float], solution: Solution) -> None:
    """d(beta P)/d rho, Lebowitz (1964), closed form and table; c_ij(0) of the same theory (Baxter factor)."""
    closed = exact.py_inverse_compressibility(solution.densities, np.array([1.0, row["ratio"]]))
    assert solution.inverse_compressibility == pytest.approx(closed, rel=1e-5)
    assert solution.inverse_compressibility == pytest.approx(row["dbPdrho_PYc"], rel=1e-5)
    c_zero = np.array([[row["c11_0"], row["c12_0"]], [row["c12_0"], row["c22_0"]]])
    assert np.max(np.abs(solution.observables.c_zero * solution.length**3 / c_zero - 1.0)) < 1e-5


def test_the_table_has_all_its_states() -> None:
    assert len(MIXTURES) == 36
    assert {row["ratio"] for row in MIXTURES} == {1.5, 2.0, 3.0}


@pytest.mark.parametrize("row", MIXTURES, ids=lambda r: f"{r['ratio']}-{r['x1']}-{r['eta']}")
def test_mixtures_at_default_accuracy(row: dict[str, float]) -> None:
    solution = solved(row)
    check_contact(row, solution, 1e-5)
    check_compressibility(row, solution)
    assert solution.virial_z == pytest.approx(row["Zv_PY"], rel=1e-5)


@pytest.mark.parametrize("row", MIXTURES, ids=lambda r: f"{r['ratio']}-{r['x1']}-{r['eta']}")
def test_contact_values_at_high_accuracy(row: dict[str, float]) -> None:
    check_contact(row, solved(row, accuracy=1e-8), 1e-7)


def test_the_checks_catch_a_wrong_closure_and_swapped_diameters() -> None:
    row = MIXTURES[4]
    with pytest.raises(AssertionError):
        check_contact(row, solved(row, closure="hnc"), 1e-5)
    with pytest.raises(AssertionError):
        check_contact(row, solved(row, swap=True), 1e-5)
    with pytest.raises(AssertionError):
        check_compressibility(row, solved(row, closure="hnc"))
    with pytest.raises(AssertionError):
        check_compressibility(row, solved(row, swap=True))
    with pytest.raises(AssertionError):  # the default accuracy does not pass the tight check
        check_contact(row, solved(row, accuracy=1e-5), 1e-7)


def check_closed_forms(row: dict[str, float], rho: np.ndarray, sigma: np.ndarray) -> None:
    """Lebowitz (1964), Boublik (1970), Mansoori et al. (1971) as coded, against the table's eight digits."""
    total = rho.sum()
    for found, name in ((exact.py_contact_values, "PY"), (exact.bmcsl_contact_values, "BMCSL")):
        g = found(rho, sigma)
        table = np.array([row[f"g11_{name}"], row[f"g12_{name}"], row[f"g22_{name}"]])
        assert np.max(np.abs(g[[0, 0, 1], [0, 1, 1]] / table - 1.0)) < DIGITS
    for pressure, name in (
        (exact.py_compressibility_pressure, "Zc_PY"),
        (exact.py_virial_pressure, "Zv_PY"),
        (exact.bmcsl_pressure, "Z_BMCSL"),
    ):
        assert pressure(rho, sigma) / total == pytest.approx(row[name], rel=DIGITS)
    assert exact.py_inverse_compressibility(rho, sigma) == pytest.approx(row["dbPdrho_PYc"], rel=DIGITS)
    root = np.sqrt(rho)
    c_zero = (np.eye(2) - exact.py_stability_matrix(np.zeros(1), rho, sigma)[0]) / (root[:, None] * root)
    table = np.array([row["c11_0"], row["c12_0"], row["c22_0"]])
    assert np.max(np.abs(c_zero[[0, 0, 1], [0, 1, 1]] / table - 1.0)) < DIGITS


def test_closed_forms_against_the_table() -> None:
    for row in MIXTURES:
        x = np.array([row["x1"], 1.0 - row["x1"]])
        sigma = np.array([1.0, row["ratio"]])
        right, swapped = ((x * row["eta"] * 6.0 / np.pi / float(x @ s**3), s) for s in (sigma, sigma[::-1]))
        check_closed_forms(row, *right)
        with pytest.raises(AssertionError):
            check_closed_forms(row, *swapped)


@pytest.mark.parametrize("closure", ["py", "msa", "rhnc"])
def test_hard_spheres_are_the_same_in_py_msa_and_rhnc(closure: str) -> None:
    """At zero depth MSA is PY by definition, and the RHNC bridge function is that of PY."""
    row = MIXTURES[10]
    check_contact(row, solved(row, closure=closure), 1e-5)


def check_direct_correlation(eta: float, solution: Solution) -> None:
    """c(r) polynomial: Wertheim (1963), Thiele (1963). In the core c = -1 - gamma, so this is also where
    g = 0 shows. The filter rounds the kink at the step, which limits the points next to it and, by its
    mirror image, next to the origin."""
    r = solution.r
    closed = exact.py_direct_correlation(r, eta)
    error = np.abs(solution.c_r[0, 0] - closed) / np.abs(closed).max()
    for gap, tolerance in ((0.02, 1e-3), (0.05, 2e-5), (0.1, 1e-6), (0.2, 1e-7)):
        assert np.max(error[(r > gap) & (np.abs(r - 1.0) > gap) & (r < 3.0)]) < tolerance, gap


@pytest.mark.parametrize("eta", [0.1, 0.3, 0.45])
def test_one_component_direct_correlation(eta: float) -> None:
    solution = solve(Mixture(1.0, 0.0), State(1.0, packing_fraction=eta), closure="py", accuracy=1e-7)
    check_direct_correlation(eta, solution)
    wrong = solve(Mixture(1.0, 0.0), State(1.0, packing_fraction=eta), closure="hnc", accuracy=1e-7)
    with pytest.raises(AssertionError):
        check_direct_correlation(eta, wrong)


def test_arrays_keep_the_core_condition() -> None:
    """By construction; that the relation itself gives g = 0 there is in test_core_condition.py."""
    solution = solve(Mixture([1.0, 1.5], [1.0, 1.5]), State(2.0, (0.5, 0.5), packing_fraction=0.4))
    for i in range(2):
        for j in range(2):
            core = solution.r < solution.mixture.pairs.diameter[i, j]
            assert np.all(solution.g_r[i, j][core] == 0.0)
            assert np.max(np.abs(solution.h_r[i, j][core] + 1.0)) == 0.0
            assert np.max(np.abs((solution.c_r + solution.gamma_r)[i, j][core] + 1.0)) < 1e-12


@pytest.mark.parametrize("row", PURE, ids=lambda r: str(r["eta"]))
def test_one_component_distribution(row: dict[str, float]) -> None:
    """g(r) from the Baxter factor by Fourier inversion (table good to about 1e-5)."""
    solution = solve(Mixture(1.0, 0.0), State(1.0, packing_fraction=row["eta"]), closure="py", accuracy=1e-7)
    assert solution.contact_values[0, 0] == pytest.approx(row["g_contact"], rel=1e-6)
    outside = solution.r > 1.0
    spline = CubicSpline(solution.r[outside], solution.g_r[0, 0][outside])
    for key, value in row.items():
        if key.startswith("g") and key[1:].replace(".", "").isdigit():
            assert float(spline(float(key[1:]))) == pytest.approx(value, abs=2e-5), key
    denser = solve(Mixture(1.0, 0.0), State(1.0, packing_fraction=1.001 * row["eta"]), closure="py", accuracy=1e-7)
    assert denser.contact_values[0, 0] != pytest.approx(row["g_contact"], rel=1e-6), "0.1 % of density must show"


@pytest.mark.parametrize("row", COORDINATION, ids=lambda r: str(r["rho"]))
def test_one_component_coordination(row: dict[str, float]) -> None:
    """Neighbours inside lam sigma of PY hard spheres: the high-temperature limit of PY and MSA wells."""
    for reach in (1.25, 1.5, 1.75, 2.0):
        solution = solve(Mixture(1.0, 0.0, reach), State(1.0, density=row["rho"]), closure="py")
        found = row["rho"] * solution.observables.shell_integral[0, 0]
        assert found == pytest.approx(row[f"n_{reach}"], abs=2e-5 * max(1.0, row[f"n_{reach}"]))
        wider = solve(Mixture(1.0, 0.0, 1.001 * reach), State(1.0, density=row["rho"]), closure="py")
        count = row["rho"] * wider.observables.shell_integral[0, 0]
        assert count != pytest.approx(row[f"n_{reach}"], abs=2e-5 * max(1.0, row[f"n_{reach}"]))
