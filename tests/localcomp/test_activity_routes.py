"""Kirkwood-Buff route, constant pressure, stability; implicit derivatives against interpolation."""

from __future__ import annotations

import math

import numpy as np
import pytest

from localcomp.activity import _direct, activity_at_packing, disconnected
from localcomp.activity_pressure import activity_at_pressure, energy_pressure, liquids_at_pressure
from localcomp.energyroute import energy_route
from localcomp.errors import NoAnswer
from localcomp.kirkwoodbuff import packing_slope, pressure_slope
from localcomp.stability import (
    branch_ends,
    inverse_concentration_fluctuations,
    sign_changes,
    stability_criterion,
    unstable_ranges,
)
from ozsolve import Mixture, State, solve
from tests.readers import numbers, read

UNLIKE = Mixture([1.0, 1.5], [1.0, 1.5], k=0.1)
ROWS = np.array([[0.0, 1.0], [0.25, 0.75], [0.5, 0.5], [1.0, 0.0]])
THREE = Mixture([1.0, 1.4, 1.2], [1.0, 1.4, 1.2], k=0.05)


# --- Kirkwood-Buff -----------------------------------------------------------------------------------


def check_kirkwood_buff(row: dict[str, float], temperature_like: float) -> None:
    """Columns dlng1_dx1 and Scc0 of kirkwood_buff_hs.csv (Percus-Yevick hard spheres, Kirkwood and Buff 1951,
    verified there against direct differentiation at constant pressure)."""
    x1 = row["x1"] * temperature_like
    state = State(1.0, (x1, 1.0 - x1), packing_fraction=row["eta"])
    solution = solve(Mixture([1.0, row["ratio"]], [0.0, 0.0]), state, closure="py", accuracy=1e-8)
    slope = pressure_slope(solution, np.array([1.0, -1.0]))
    assert slope[0] == pytest.approx(row["dlng1_dx1"], rel=1e-5)
    assert x1 * slope[0] + (1.0 - x1) * slope[1] == pytest.approx(0.0, abs=1e-10)  # Gibbs-Duhem
    inverse = inverse_concentration_fluctuations([solution])[0]
    assert x1 * (1.0 - x1) / inverse == pytest.approx(row["Scc0"], rel=1e-5)
    assert 1.0 + x1 * slope[0] == pytest.approx(inverse, rel=1e-6)


def test_kirkwood_buff_table() -> None:
    for row in map(numbers, read("kirkwood_buff_hs")):
        check_kirkwood_buff(row, 1.0)
        with pytest.raises(AssertionError):
            check_kirkwood_buff(row, 1.01)


def test_packing_slope_obeys_gibbs_duhem_and_is_the_integral() -> None:
    solution = solve(UNLIKE, State(2.0, (0.4, 0.6), packing_fraction=0.4), accuracy=1e-7)
    slope = packing_slope(solution, np.array([1.0, -1.0]))
    assert abs(float(np.array([0.4, 0.6]) @ slope)) < 1e-10
    assert abs(float(np.array([0.41, 0.59]) @ slope)) > 1e-3
    near = [[0.4 + d, 0.6 - d] for d in (0.005, -0.005)]
    found = activity_at_packing(UNLIKE, 2.0, 0.4, near)[0]
    volume = UNLIKE.diameter**3
    phi = [row[0] * volume[0] / (np.array(row) @ volume) for row in near]
    by_difference = (found.kirkwood_buff[0] - found.kirkwood_buff[1]) / (phi[0] - phi[1])
    assert by_difference == pytest.approx(slope, rel=1e-3)


def test_routes_of_equal_sizes_agree_and_the_gap_is_reported() -> None:
    """RHNC is nearly consistent where no hard-sphere part enters; with unequal sizes the gap is that of the
    hard-sphere equations of state, and the report does not hide it."""
    found = activity_at_packing(Mixture([1.0, 1.0], [1.0, 1.0], k=0.15), 1.5, 0.35, ROWS)[0]
    assert np.abs(found.route_gap).max() < 2e-3
    assert found.ln_gamma[0, 0] > 0.9
    unequal = activity_at_packing(UNLIKE, 2.0, 0.4, ROWS)[0]
    assert 0.02 < np.abs(unequal.route_gap).max() < 0.3
    py = activity_at_packing(UNLIKE, 2.0, 0.4, ROWS, closure="py")[0]
    assert np.abs(py.ln_gamma - unequal.ln_gamma).max() > 0.01


# --- implicit derivatives ----------------------------------------------------------------------------


def test_implicit_derivatives_agree_with_interpolation() -> None:
    spectral = activity_at_packing(UNLIKE, 2.0, 0.4, ROWS)[0]
    implicit = _direct(UNLIKE, 2.0, 0.4, ROWS, "rhnc", 1e-5, True)
    assert spectral.interpolated
    assert not implicit.interpolated
    assert np.abs(spectral.ln_gamma - implicit.ln_gamma).max() < 1e-5
    assert np.abs(spectral.kirkwood_buff - implicit.kirkwood_buff).max() < 1e-4
    assert np.abs(spectral.excess_energy - implicit.excess_energy).max() < 1e-5
    assert np.abs(spectral.ln_gamma - spectral.kirkwood_buff).max() > 1e-2


def test_three_species_reduce_to_two() -> None:
    """Two of three species alike are one; a missing species is not there."""
    pair = Mixture([1.0, 1.4], [1.0, 1.4], k=0.1)
    k = np.array([[0.0, 0.0, 0.1], [0.0, 0.0, 0.1], [0.1, 0.1, 0.0]])
    split = Mixture([1.0, 1.0, 1.4], [1.0, 1.0, 1.4], k=k)
    two = activity_at_packing(pair, 2.0, 0.38, [[0.4, 0.6]])[0]
    three = activity_at_packing(split, 2.0, 0.38, [[0.1, 0.3, 0.6], [0.0, 0.4, 0.6]], routes=False)[0]
    for row in three.ln_gamma:
        assert row[[0, 1]] == pytest.approx(two.ln_gamma[0, [0, 0]], abs=1e-5)
        assert row[2] == pytest.approx(two.ln_gamma[0, 1], abs=1e-5)


# --- constant pressure -------------------------------------------------------------------------------

STATE = State(2.0, (0.5, 0.5), packing_fraction=0.4)


@pytest.fixture(scope="module")
def pressure() -> float:
    return energy_pressure(UNLIKE, STATE, "rhnc", 1e-5)


def test_densities_meet_the_pressure(pressure: float) -> None:
    rows = np.array([[0.5, 0.5], [1.0, 0.0]])
    found = liquids_at_pressure(UNLIKE, 2.0, pressure, rows, np.array([0.37, 0.37]), "rhnc", 1e-5)
    assert found[0].packing_fraction == pytest.approx(0.4, abs=1e-5)
    for row, liquid in zip(rows, found, strict=True):
        state = State(2.0, tuple(row), packing_fraction=liquid.packing_fraction)
        reached = energy_route(UNLIKE, state, "rhnc").z * float(UNLIKE.densities(state).sum()) * 2.0
        assert reached == pytest.approx(pressure, rel=1e-4)
        assert reached != pytest.approx(1.001 * pressure, rel=1e-4)


def test_gibbs_duhem_and_stability_at_constant_pressure(pressure: float) -> None:
    """sum x_i d ln gamma_i = 0; excess volume is d(G_ex)/dP; ln gamma's Kirkwood-Buff slope is S_cc(0)."""
    step = 0.002
    rows = [[0.5 + step, 0.5 - step], [0.5 - step, 0.5 + step], [0.5, 0.5], [1.0, 0.0], [0.0, 1.0]]
    found = activity_at_pressure(UNLIKE, 2.0, pressure, rows)
    slope = (found.ln_gamma[0] - found.ln_gamma[1]) / (2.0 * step)
    assert abs(float(np.array([0.5, 0.5]) @ slope)) < 1e-4
    assert abs(float(np.array([0.52, 0.48]) @ slope)) > 1e-3
    kb = (found.kirkwood_buff[0, 0] - found.kirkwood_buff[1, 0]) / (2.0 * step)
    assert 1.0 + 0.5 * kb == pytest.approx(found.inverse_scc[2], rel=1e-4)
    assert found.ln_gamma[3, 0] == pytest.approx(0.0, abs=1e-6)
    assert found.ln_gamma[4, 1] == pytest.approx(0.0, abs=1e-6)
    assert found.excess_enthalpy == pytest.approx(found.excess_energy + pressure / 2.0 * found.excess_volume)
    change = 0.02 * pressure
    above = activity_at_pressure(UNLIKE, 2.0, pressure + change, [[0.5, 0.5]])
    by_pressure = (above.excess_free_energy[0] - found.excess_free_energy[2]) * 2.0 / change
    between = 0.5 * (above.excess_volume[0] + found.excess_volume[2])
    assert by_pressure == pytest.approx(between, rel=0.005)
    assert by_pressure != pytest.approx(1.02 * between, rel=0.005)


def test_identical_species_are_ideal_at_constant_pressure() -> None:
    found = activity_at_pressure(Mixture([1.0, 1.0], [1.0, 1.0]), 1.5, 1.0, ROWS)
    assert np.abs(found.ln_gamma).max() < 1e-5
    assert np.abs(found.excess_volume).max() < 1e-5


def test_a_pressure_without_liquid_is_no_answer() -> None:
    with pytest.raises(NoAnswer, match="pure"):
        activity_at_pressure(Mixture([1.0, 1.0], [1.0, 1.2]), 1.0, -50.0, ROWS, accuracy=1e-3)


def test_a_splitting_mixture_at_constant_pressure_has_no_numbers_between() -> None:
    mixture = Mixture([1.0, 1.0], [1.0, 1.0], k=0.4)
    found = activity_at_pressure(mixture, 1.2, 2.0, [[0.0, 1.0], [0.5, 0.5]], accuracy=1e-3)
    assert found.available.tolist() == [True, False]
    assert np.isnan(found.ln_gamma[1]).all()
    assert found.ln_gamma[0, 0] > 2.0


def test_three_species_inside_the_two_phase_region() -> None:
    """As two species, one of them split in two: the island on the symmetry line has no way out."""
    k = np.array([[0.0, 0.0, 0.4], [0.0, 0.0, 0.4], [0.4, 0.4, 0.0]])
    mixture = Mixture([1.0, 1.0, 1.0], [1.0, 1.0, 1.0], k=k)
    found = activity_at_packing(mixture, 1.2, 0.4, [[0.25, 0.25, 0.5], [0.0, 0.01, 0.99]], accuracy=1e-3)[0]
    assert found.available.tolist() == [False, True]


# --- stability ---------------------------------------------------------------------------------------


def margules(x: np.ndarray, a: float) -> np.ndarray:
    """ln gamma_1 = a x2^2, ln gamma_2 = a x1^2 (one-constant Margules: splits for a > 2, spinodal at
    x1 x2 = 1/(2 a))."""
    return np.stack((a * (1.0 - x) ** 2, a * x**2), axis=1)


def test_spinodal_of_a_model_is_found() -> None:
    x = np.linspace(0.0, 1.0, 2001)
    ((low, high),) = unstable_ranges(x, stability_criterion(x, margules(x, 2.5)))
    root = 0.5 * (1.0 - math.sqrt(1.0 - 4.0 / (2.0 * 2.5)))
    assert low == pytest.approx(root, abs=1e-5)
    assert high == pytest.approx(1.0 - root, abs=1e-5)
    assert unstable_ranges(x, stability_criterion(x, margules(x, 1.99))) == []


def test_wilson_cannot_split() -> None:
    """Wilson, J. Am. Chem. Soc. 86 (1964) 127: no parameters give two liquids (common practice; here a sweep)."""
    x = np.linspace(0.0, 1.0, 1001)
    for l12 in (1e-3, 0.05, 1.0, 20.0):
        for l21 in (1e-3, 0.05, 1.0, 20.0):
            s1, s2 = x + l12 * (1.0 - x), (1.0 - x) + l21 * x
            bracket = l12 / s1 - l21 / s2
            ln_gamma = np.stack((-np.log(s1) + (1.0 - x) * bracket, -np.log(s2) - x * bracket), axis=1)
            assert unstable_ranges(x[1:-1], stability_criterion(x, ln_gamma)[1:-1]) == []


def test_sign_changes_skip_what_is_missing() -> None:
    x = np.array([0.0, 0.25, 0.5, 0.75, 1.0])
    assert sign_changes(x, np.array([1.0, math.nan, -1.0, -1.0, 1.0])) == pytest.approx([0.25, 0.875])
    assert unstable_ranges(x, np.array([-1.0, -1.0, 1.0, 1.0, -1.0])) == [(0.0, 0.375), (0.875, 1.0)]
    assert unstable_ranges(x, np.full(5, math.nan)) == []


def test_an_island_between_gaps_is_disconnected() -> None:
    tried = np.array([0.0, 0.1, 0.5, 0.9, 1.0])
    good = np.array([True, False, True, False, True])
    assert disconnected(tried, good, np.array([0.0, 0.05, 0.5, 0.95])).tolist() == [False, False, True, False]
    assert not disconnected(tried, np.ones(5, bool), np.array([0.5])).any()


def test_branch_ends_are_found_by_bisection() -> None:
    mixture = Mixture([1.0, 1.0], [1.0, 1.0], k=0.4)
    x = np.array([0.0, 0.2, 0.8, 1.0])
    ((low, high),) = branch_ends(mixture, 1.2, 0.4, x, np.array([True, False, False, True]), "rhnc", 1e-4)
    assert 0.0 < low < 0.2
    assert high == pytest.approx(1.0 - low, abs=0.005)
    at_end = solve(mixture, State(1.2, (low, 1.0 - low), packing_fraction=0.4), accuracy=1e-4)
    assert inverse_concentration_fluctuations([at_end])[0] < 0.7
    beyond = State(1.2, (low + 0.01, 0.99 - low), packing_fraction=0.4)
    assert not solve(mixture, beyond, accuracy=1e-4, on_failure="return").status.usable


def test_stability_of_three_species() -> None:
    found = activity_at_packing(THREE, 2.0, 0.38, [[0.3, 0.3, 0.4]], routes=False)[0]
    assert 0.0 < found.inverse_scc[0] < 1.2
    ideal = Mixture([1.0, 1.0, 1.0], [1.0, 1.0, 1.0])
    same = activity_at_packing(ideal, 2.0, 0.38, [[0.3, 0.3, 0.4]], routes=False)[0]
    assert same.inverse_scc[0] == pytest.approx(1.0, abs=1e-6)
