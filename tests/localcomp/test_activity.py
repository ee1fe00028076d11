"""ln gamma at constant packing fraction against closed forms, thermodynamic identities and simulation."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest

from localcomp.activity import activity_at_packing
from localcomp.activity_parts import Activity, mole_fractions_of, volume_fractions
from localcomp.betapath import beta_paths, quadrature_error, radau
from localcomp.chebyshev import Interpolant, chebyshev_points
from localcomp.errors import NoAnswer
from localcomp.hardspheres import bmcsl_chemical_potentials, bmcsl_compressibility_factor, bmcsl_helmholtz
from ozsolve import InputError, Mixture, PairOverride, State, solve
from tests.readers import numbers, read

TENTHS = np.stack((np.arange(11) / 10, 1.0 - np.arange(11) / 10), axis=1)


def isotherm(mixture: Mixture, temperature: float, eta: float, x: Any = TENTHS, **options: Any) -> Activity:
    return activity_at_packing(mixture, temperature, eta, x, **options)[0]


# --- hard spheres ------------------------------------------------------------------------------------


def check_hard_row(row: dict[str, float], scale: float) -> None:
    """Column Z_BMCSL of hs_mixture_py_bmcsl.csv; Z = 1 + sum x_i beta mu_i - A/(N kT)."""
    diameter = np.array([1.0, row["ratio"]])
    rho = np.array([row["x1"], 1.0 - row["x1"]]) * row["rho"]
    mu, a = bmcsl_chemical_potentials(rho, diameter), bmcsl_helmholtz(rho, diameter)
    z = 1.0 + scale * float(mu @ rho) / float(rho.sum()) - a
    assert z == pytest.approx(row["Z_BMCSL"], rel=1e-6)


def test_hard_sphere_potentials_have_the_published_pressure() -> None:
    """Boublik (1970), Mansoori, Carnahan, Starling and Leland (1971), values of the file."""
    for row in map(numbers, read("hs_mixture_py_bmcsl")):
        check_hard_row(row, 1.0)
        with pytest.raises(AssertionError):
            check_hard_row(row, 1.001)


@pytest.mark.parametrize("scale", [1.0, 0.1, 1e-3])
def test_hard_sphere_potentials_are_derivatives(scale: float) -> None:
    """beta mu_i = d(beta A_res/V)/d rho_i; Z = rho d(A/N kT)/d rho + 1; both across the series' border."""
    diameter, rho = np.array([1.0, 1.5, 0.8]), scale * np.array([0.2, 0.1, 0.05])
    mu, step = bmcsl_chemical_potentials(rho, diameter), 1e-5 * scale
    for i, unit in enumerate(np.eye(3)):
        up, down = rho + step * unit, rho - step * unit
        slope = (bmcsl_helmholtz(up, diameter) * up.sum() - bmcsl_helmholtz(down, diameter) * down.sum()) / (2 * step)
        assert mu[i] == pytest.approx(slope, rel=1e-8)
        assert abs(mu[i] / slope - 1.001) > 1e-8
    denser, thinner = (bmcsl_helmholtz(rho * (1 + s), diameter) for s in (1e-5, -1e-5))
    assert bmcsl_compressibility_factor(rho, diameter) == pytest.approx(1.0 + (denser - thinner) / 2e-5, rel=1e-8)


def test_a_hard_sphere_mixture_is_flory_huggins_and_hard_spheres() -> None:
    found = isotherm(Mixture([1.0, 1.5], [0.0, 0.0]), 1.0, 0.35)
    assert np.all(found.parts.attraction == 0.0)
    v = np.array([1.0, 1.5**3])
    mean = TENTHS @ v
    assert found.parts.flory_huggins[:, 0] == pytest.approx(np.log(v[0] / mean) + 1.0 - v[0] / mean, abs=1e-14)
    assert np.all(found.excess_energy == 0.0)
    # sum x_i ln gamma_i is the Helmholtz energy of mixing at one packing fraction (closed form)
    a = []
    for x in TENTHS:
        rho = x * 0.35 * 6 / math.pi / float(x @ v)
        a.append(bmcsl_helmholtz(rho, np.array([1.0, 1.5])))
    mixing = np.array(a) - TENTHS @ [a[-1], a[0]]
    phi = volume_fractions(np.array([1.0, 1.5]), TENTHS)
    entropy = np.sum(TENTHS * np.log(np.where(TENTHS > 0, phi / np.maximum(TENTHS, 1e-300), 1.0)), axis=1)
    assert found.excess_free_energy == pytest.approx(mixing + entropy, abs=1e-12)
    assert found.excess_free_energy[5] != pytest.approx(entropy[5], abs=1e-3)


# --- limits and symmetries ---------------------------------------------------------------------------


@pytest.mark.parametrize("closure", ["rhnc", "hnc", "py", "msa"])
def test_identical_species_are_ideal(closure: str) -> None:
    like = Mixture([1.2, 1.2], [0.9, 0.9])
    assert np.abs(isotherm(like, 1.4, 0.4, closure=closure).ln_gamma).max() < 1e-7  # where iterations stop
    found = isotherm(like, 1.4, 0.4, closure=closure, accuracy=1e-8)
    assert np.abs(found.ln_gamma).max() < 1e-10
    assert np.abs(found.excess_energy).max() < 1e-10
    other = isotherm(Mixture([1.2, 1.2], [0.9, 0.9], k=1e-4), 1.4, 0.4, closure=closure)
    assert np.abs(other.ln_gamma).max() > 1e-5, "a difference of one in ten thousand is seen"


def test_three_identical_species_are_ideal() -> None:
    found = isotherm(Mixture([1.0, 1.0, 1.0], [1.0, 1.0, 1.0]), 1.5, 0.4, [[0.2, 0.3, 0.5], [0.0, 0.4, 0.6]])
    assert np.abs(found.ln_gamma).max() < 1e-7  # linear solves to 1e-8


def test_a_symmetric_mixture_is_symmetric() -> None:
    found = isotherm(Mixture([1.0, 1.0], [1.0, 1.0], k=0.2), 1.6, 0.38)
    assert found.ln_gamma == pytest.approx(found.ln_gamma[::-1, ::-1], abs=1e-7)
    assert found.kirkwood_buff == pytest.approx(found.kirkwood_buff[::-1, ::-1], abs=1e-6)
    lopsided = isotherm(Mixture([1.0, 1.0], [1.0, 1.01], k=0.2), 1.6, 0.38)
    assert np.abs(lopsided.ln_gamma - lopsided.ln_gamma[::-1, ::-1]).max() > 1e-4


def test_relabelling_changes_nothing() -> None:
    one = isotherm(Mixture([1.0, 1.4], [1.0, 1.3], k=0.1), 2.0, 0.4)
    two = isotherm(Mixture([1.4, 1.0], [1.3, 1.0], k=0.1), 2.0, 0.4)
    assert one.ln_gamma == pytest.approx(two.ln_gamma[::-1, ::-1], abs=1e-7)


def gibbs_duhem(curve_x: np.ndarray, ln_gamma: np.ndarray) -> float:
    """Largest |x1 d ln gamma_1/dx1 + x2 d ln gamma_2/dx1| over the inner points, by fourth-order differences."""
    h = curve_x[1, 0] - curve_x[0, 0]
    slope = (8.0 * (ln_gamma[3:-1] - ln_gamma[1:-3]) - (ln_gamma[4:] - ln_gamma[:-4])) / (12.0 * h)
    return float(np.abs(np.sum(curve_x[2:-2] * slope, axis=1)).max())


def test_gibbs_duhem() -> None:
    found = isotherm(Mixture([1.0, 1.5], [1.0, 1.5], k=0.1), 2.0, 0.4)
    assert found.curve is not None
    assert gibbs_duhem(found.curve.mole_fractions, found.curve.ln_gamma) < 2e-4  # the differences' own error
    wrong = found.curve.ln_gamma * np.array([1.0, 1.02])
    assert gibbs_duhem(found.curve.mole_fractions, wrong) > 2e-3


def test_gibbs_duhem_of_three_species() -> None:
    """sum_i x_i d ln gamma_i = 0 along any direction."""
    mixture, x = Mixture([1.0, 1.3, 1.1], [1.0, 1.4, 1.2], k=0.05), np.array([0.3, 0.3, 0.4])
    move, step = np.array([1.0, -0.6, -0.4]), 0.01
    found = isotherm(mixture, 2.0, 0.38, [x, x + step * move, x - step * move], routes=False)
    slope = (found.ln_gamma[1] - found.ln_gamma[2]) / (2.0 * step)
    assert np.abs(slope).max() > 0.05
    assert abs(float(x @ slope)) < 2e-4
    assert abs(float(np.array([0.35, 0.3, 0.35]) @ slope)) > 2e-4


# --- perturbation theory and virial limits -----------------------------------------------------------


def first_order(mixture: Mixture, eta: float, x: np.ndarray, beta: float) -> float:
    """First-order attraction part of A/(N kT), beta (U/N) averaged over the hard-sphere fluid (Zwanzig, J. Chem.
    Phys. 22 (1954) 1420), from the neighbours in the wells of a solved hard-sphere mixture."""
    hard = Mixture(mixture.diameter, [0.0, 0.0], 1.5)
    solution = solve(hard, State(1.0, tuple(x), packing_fraction=eta), closure="rhnc", accuracy=1e-7)
    rho = solution.densities
    integrals, _ = solution.shell_integral(mixture.pairs.well_edge)
    pairs = np.outer(rho, rho) * integrals * mixture.pairs.well_depth
    return -0.5 * beta * float(pairs.sum()) / float(rho.sum())


def check_first_order(found: float, expected: float) -> None:
    assert found == pytest.approx(expected, rel=0.01)


def test_first_order_perturbation_theory_at_high_temperature() -> None:
    mixture, eta, temperature = Mixture([1.0, 1.4], [1.0, 1.3], k=0.2), 0.38, 100.0
    found = isotherm(mixture, temperature, eta, [[0.5, 0.5]])
    a = [first_order(mixture, eta, x, 1.0 / temperature) for x in np.array([[0.5, 0.5], [1.0, 0.0], [0.0, 1.0]])]
    expected = a[0] - 0.5 * (a[1] + a[2])
    attraction = float(found.parts.attraction[0] @ [0.5, 0.5])
    check_first_order(attraction, expected)
    with pytest.raises(AssertionError):
        check_first_order(attraction, 1.02 * expected)
    cold = isotherm(mixture, 1.5, eta, [[0.5, 0.5]])
    with pytest.raises(AssertionError):
        check_first_order(float(cold.parts.attraction[0] @ [0.5, 0.5]), expected * temperature / 1.5)


def attraction_b2(mixture: Mixture, temperature: float) -> np.ndarray:
    """Attraction part of B_ij, -(2 pi/3) sigma_ij^3 (lam^3 - 1)(exp(eps_ij/kT) - 1): Kihara, Rev. Mod. Phys. 25
    (1953) 831."""
    pairs = mixture.pairs
    shell = pairs.well_edge**3 - pairs.diameter**3
    return -2.0 * math.pi / 3.0 * shell * np.expm1(pairs.well_depth / temperature)


def second_virial_ln_gamma(mixture: Mixture, temperature: float, eta: float, x: np.ndarray) -> np.ndarray:
    """Attraction part of ln gamma at small constant packing fraction: A_at/(N kT) = rho sum x_i x_j B_ij;
    d(n A)/d n_i with V = sum n_j v_j/eta."""
    b, v = attraction_b2(mixture, temperature), math.pi / 6.0 * mixture.diameter**3
    mean = float(x @ v)
    rho = eta / mean
    quadratic = float(x @ b @ x)
    mixed = 2.0 * rho * (b @ x) - rho * quadratic * v / mean
    return np.asarray(mixed - eta * np.diag(b) / v)


def check_virial(found: np.ndarray, expected: np.ndarray) -> None:
    assert np.abs(found - expected).max() < 2e-3 * np.abs(expected).max()


def test_second_virial_limit_at_low_density() -> None:
    mixture, x, eta = Mixture([1.0, 1.5], [1.0, 1.5], k=0.3), np.array([0.4, 0.6]), 1e-5
    found = isotherm(mixture, 1.5, eta, [x, [0.0, 1.0], [1.0, 0.0]], accuracy=1e-7)
    for n, row in enumerate(found.mole_fractions):
        expected = second_virial_ln_gamma(mixture, 1.5, eta, row)
        check_virial(found.parts.attraction[n], expected)
        with pytest.raises(AssertionError):
            check_virial(found.parts.attraction[n], second_virial_ln_gamma(mixture, 1.52, eta, row))


# --- simulation --------------------------------------------------------------------------------------


def exchange(row: dict[str, float], closure: str) -> float:
    """beta(mu_2 - mu_1) residual at constant density of equal-size species."""
    x1 = row["N1"] / (row["N1"] + row["N2"])
    eps = np.array([row["eps11"], row["eps22"]])
    mixture = Mixture(
        [1.0, 1.0], eps, 1.5, overrides=[PairOverride(0, 1, well_depth=row["eps12"], diameter=1.0, well_range=1.5)]
    )
    eta = math.pi / 6.0 * row["rho"]
    found = isotherm(mixture, row["T"], eta, [[x1, 1.0 - x1]], closure=closure)
    pure = beta_paths([(mixture, State(row["T"], tuple(p), packing_fraction=eta)) for p in np.eye(2)], closure, 1e-5)
    difference = found.ln_gamma[0, 1] - found.ln_gamma[0, 0]
    return float(difference + pure[1].helmholtz - pure[0].helmholtz)


EXCHANGED = ("M1a", "M1b", "M1c", "M2b")


@pytest.mark.parametrize("run", EXCHANGED)
def test_identity_exchange_of_simulation(run: str) -> None:
    """Own canonical Monte Carlo (sw_monte_carlo.csv), N = 500; the finite-size term and doubled statistical errors
    are within 0.003."""
    (row,) = [numbers(r) for r in read("sw_monte_carlo") if r["run"] == run]
    found = exchange(row, "rhnc")
    assert abs(found - row["bdmu_1to2"]) < 0.01 * abs(row["bdmu_1to2"]) + 0.003


def test_that_check_can_fail() -> None:
    (row,) = [numbers(r) for r in read("sw_monte_carlo") if r["run"] == "M1a"]
    assert abs(exchange({**row, "eps22": 0.52}, "rhnc") - row["bdmu_1to2"]) > 0.01 * row["bdmu_1to2"] + 0.003


# --- numerical error ---------------------------------------------------------------------------------

HARD_CASES = {
    "ratio 1.5": (Mixture([1.0, 1.5], [1.0, 1.5], k=0.1), 2.0, 0.40),
    "ratio 2, deep": (Mixture([1.0, 2.0], [1.0, 1.5], k=0.1), 2.0, 0.40),
    "ratio 2, strong unlike": (Mixture([1.0, 2.0], [1.0, 1.0], k=-0.1), 1.2, 0.40),
}


@pytest.mark.parametrize("name", list(HARD_CASES))
def test_numerical_error_is_below_one_in_ten_thousand(name: str) -> None:
    """Default settings against implicit derivatives at a hundredfold accuracy with more points in beta: no
    interpolation, another way to the composition derivative."""
    mixture, temperature, eta = HARD_CASES[name]
    x = np.array([[0.0, 1.0], [0.3, 0.7], [1.0, 0.0]])
    found = isotherm(mixture, temperature, eta, x)
    paths = beta_paths([(mixture, State(temperature, tuple(row), packing_fraction=eta)) for row in x], "rhnc", 1e-7, 8)
    volume = mixture.diameter**3
    pure = np.array([paths[2].helmholtz, paths[0].helmholtz])
    exact = []
    for row, path in zip(x, paths, strict=True):
        mu = path.chemical_potentials()
        exact.append(mu - volume / float(row @ volume) * float(row @ mu - path.helmholtz) - pure)
    error = np.abs(found.parts.attraction - np.array(exact))
    assert error.max() < 1e-4
    assert np.all(found.numerical_error < 1e-4)
    assert np.all(error < found.numerical_error + 1e-9)


def test_volume_fraction_converges_fastest() -> None:
    """Degree 8 in mole, surface and volume fraction against degree 16 in the last; size ratio 2."""
    mixture, temperature, eta = HARD_CASES["ratio 2, deep"]

    def infinite(power: int, degree: int) -> float:
        s = chebyshev_points(degree)
        weight = mixture.diameter**power
        x = mole_fractions_of(weight ** (1.0 / 3.0), np.stack((s, 1.0 - s), axis=1))
        paths = beta_paths([(mixture, State(temperature, tuple(r), packing_fraction=eta)) for r in x], "rhnc", 1e-5, 3)
        f = np.array([path.helmholtz for path in paths]) / (x @ weight)
        f -= f[-1] * s + f[0] * (1.0 - s)
        return float(-weight[1] * Interpolant(f).slope(np.array([1.0]))[0])

    best = infinite(3, 16)
    misses = [abs(infinite(power, 8) - best) for power in (0, 2, 3)]
    assert misses[2] < misses[1] / 2 < misses[0]
    assert misses[2] < 5e-5


def test_radau_rule_and_its_error_estimate() -> None:
    """int_0^1 exp(a b) db = (e^a - 1)/a; the rule of n points is exact to degree 2n - 2."""
    for points in (4, 6, 9):
        nodes, weights = radau(points)
        assert nodes[-1] == 1.0
        degree = 2 * points - 2
        assert float(weights @ nodes**degree) == pytest.approx(1.0 / (degree + 1), rel=1e-12)
        assert float(weights @ nodes ** (degree + 1)) != pytest.approx(1.0 / (degree + 2), rel=1e-12)
    nodes, weights = radau(4)
    for a in (2.0, 4.0):
        error = abs(float(weights @ np.exp(a * nodes)) - math.expm1(a) / a)
        estimate = quadrature_error(np.exp(a * nodes))
        assert error < estimate < 1e4 * error


# --- paths that are not there ------------------------------------------------------------------------


def test_a_path_through_the_two_phase_region_is_reported() -> None:
    """k = 0.4 at kT = 1.2 splits; both pure liquids and dilute mixtures are fine. On the symmetry line the closure
    keeps a solution: an island between compositions without one, and no number may come from it."""
    mixture = Mixture([1.0, 1.0], [1.0, 1.0], k=0.4)
    island = solve(mixture, State(1.2, (0.5, 0.5), packing_fraction=0.4))
    assert island.status.usable
    found = isotherm(mixture, 1.2, 0.40, [[0.0, 1.0], [0.02, 0.98], [0.1, 0.9], [0.5, 0.5]], accuracy=1e-3)
    assert found.available.tolist() == [True, True, False, False]
    assert "no solution" in found.reasons[2]
    assert "two-phase" in found.reasons[3]
    assert np.isnan(found.ln_gamma[2:]).all()
    assert np.isfinite(found.ln_gamma[:2]).all()
    assert found.ln_gamma[0, 0] > found.ln_gamma[1, 0] > 2.0


def test_a_pure_liquid_without_solution_is_no_answer() -> None:
    with pytest.raises(NoAnswer, match="pure"):
        isotherm(Mixture([1.0, 1.0], [1.0, 4.0]), 1.1, 0.2, accuracy=1e-3)


def test_only_additive_diameters() -> None:
    bent = Mixture([1.0, 1.2], [1.0, 1.0], overrides=[PairOverride(0, 1, diameter=1.15)])
    with pytest.raises(NoAnswer, match="additive"):
        isotherm(bent, 2.0, 0.3)


def test_wrong_compositions_are_named() -> None:
    with pytest.raises(InputError, match="mole_fractions"):
        isotherm(Mixture([1.0, 1.2], [1.0, 1.0]), 2.0, 0.3, [[0.5, 0.6]])


def test_several_temperatures_at_once() -> None:
    mixture = Mixture([1.0, 1.2], [1.0, 1.2], k=0.1)
    both = activity_at_packing(mixture, [1.6, 2.4], 0.4, TENTHS)
    for found, temperature in zip(both, (1.6, 2.4), strict=True):
        alone = isotherm(mixture, temperature, 0.4)
        assert found.temperature == temperature
        assert np.abs(found.ln_gamma - alone.ln_gamma).max() < 1e-5
    assert np.abs(both[0].ln_gamma - both[1].ln_gamma).max() > 0.05
