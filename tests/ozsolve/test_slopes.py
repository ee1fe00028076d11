"""Slopes by implicit differentiation against differences of whole solves."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest

from ozsolve import CLOSURES, InputError, Mixture, PairOverride, Solution, State, sensitivity, solve
from ozsolve.equations import Fluid
from ozsolve.response import Response

SIGMA, DEPTH, K, X, T, ETA = (1.0, 1.5), np.array([1.0, 1.5]), 0.1, (0.5, 0.5), 2.0, 0.40
STEP = 1e-3
TOLERANCE = 1e-4


def at(closure: str, depth: float = 0.0, density: float = 0.0) -> Solution:
    """All depths times 1 + depth, density times 1 + density."""
    mixture = Mixture(SIGMA, DEPTH * (1.0 + depth), k=K)
    return solve(mixture, State(T, X, packing_fraction=ETA * (1.0 + density)), closure=closure, accuracy=1e-9)


MOVES: dict[str, Callable[[Fluid, float], Fluid]] = {
    "depth": lambda fluid, t: fluid.scaled(attraction=1.0 + t),
    "density": lambda fluid, t: fluid.scaled(density=1.0 + t),
}
FIELDS = ("shell_integral", "contact", "energy", "virial", "inverse_compressibility")


def check_slope(found: np.ndarray, differences: np.ndarray) -> None:
    assert np.max(np.abs(found - differences)) < TOLERANCE * np.abs(differences).max()


@pytest.mark.parametrize("parameter", list(MOVES))
@pytest.mark.parametrize("closure", list(CLOSURES))
def test_response_against_differences_of_solve(closure: str, parameter: str) -> None:
    here = at(closure)
    level, move = here.fine, MOVES[parameter]
    response = Response(level.equations, level.x, level.reference, lambda t: move(level.fluid, t))
    ends = [at(closure, **{parameter: n * STEP}).observables for n in (-2, -1, 1, 2)]
    for name in FIELDS:
        low, down, up, high = (np.asarray(getattr(end, name)) for end in ends)
        differences = (8.0 * (up - down) - (high - low)) / (12.0 * STEP)
        found = np.asarray(response.slope(name))
        check_slope(found, differences)
        with pytest.raises(AssertionError):
            check_slope(1.001 * found, differences)


@pytest.mark.parametrize("closure", list(CLOSURES))
def test_density_slopes_that_a_solution_reports(closure: str) -> None:
    here = at(closure)
    ends = [at(closure, density=n * STEP) for n in (-2, -1, 1, 2)]
    for found, values in (
        (here.energy_density_slope, [s.internal_energy for s in ends]),
        (here.virial_inverse_compressibility, [s.virial_z * s.densities.sum() / here.densities.sum() for s in ends]),
    ):
        low, down, up, high = values
        differences = np.array((8.0 * (up - down) - (high - low)) / (12.0 * STEP))
        check_slope(np.array(found), differences)
        with pytest.raises(AssertionError):
            check_slope(np.array(1.001 * found), differences)
    assert here.route_gap == here.virial_inverse_compressibility - here.inverse_compressibility


def moved(closure: str, parameter: str, species: tuple[int, ...], t: float, x1: float = 0.5) -> Solution:
    """Solved afresh with one parameter changed by t."""
    k, depth, temperature, eta, x = K, np.array(DEPTH), T, ETA, np.array([x1, 1.0 - x1])
    mixture = Mixture(SIGMA, depth, k=k)
    if parameter == "temperature":
        temperature += t
    elif parameter == "density":
        eta *= np.exp(t)
    elif parameter == "mole_fraction":
        goal = np.eye(2)[species[0]]
        x = x + t / (1.0 - x[species[0]]) * (goal - x)
    elif parameter == "k":
        mixture = Mixture(SIGMA, depth, k=k + t)
    elif species == (0, 1):
        pair = float(mixture.pairs.well_depth[0, 1]) + t
        mixture = Mixture(SIGMA, depth, overrides=[PairOverride(0, 1, well_depth=pair)])
    else:
        pair = float(mixture.pairs.well_depth[0, 1])
        depth[species[0]] += t
        mixture = Mixture(SIGMA, depth, overrides=[PairOverride(0, 1, well_depth=pair)])
    return solve(mixture, State(temperature, tuple(x), packing_fraction=eta), closure=closure, accuracy=1e-9)


def counts(solution: Solution) -> np.ndarray:
    return solution.densities[None, :] * solution.observables.shell_integral * solution.length**3


DIRECTIONS = [
    ("temperature", ()), ("density", ()), ("k", (0, 1)), ("well_depth", (0, 1)), ("well_depth", (1, 1)),
    ("mole_fraction", (0,)), ("mole_fraction", (1,)),
]  # fmt: skip


@pytest.mark.parametrize(("parameter", "species"), DIRECTIONS, ids=lambda v: str(v))
@pytest.mark.parametrize("closure", list(CLOSURES))
def test_sensitivities_against_differences_of_solve(closure: str, parameter: str, species: tuple[int, ...]) -> None:
    found = sensitivity(moved(closure, parameter, species, 0.0), parameter, species)
    ends = [moved(closure, parameter, species, n * STEP) for n in (-2, -1, 1, 2)]
    for slope, values in (
        (found.coordination_numbers, [counts(s) for s in ends]),
        (np.array(found.internal_energy), [np.array(s.internal_energy) for s in ends]),
    ):
        low, down, up, high = values
        differences = (8.0 * (up - down) - (high - low)) / (12.0 * STEP)
        check_slope(slope, differences)
        with pytest.raises(AssertionError):
            check_slope(1.001 * slope, differences)


def test_a_species_that_is_not_there_can_be_added() -> None:
    found = sensitivity(moved("rhnc", "mole_fraction", (0,), 0.0, x1=0.0), "mole_fraction", (0,))
    ends = [moved("rhnc", "mole_fraction", (0,), n * STEP, x1=0.0) for n in range(4)]
    for slope, values in (
        (found.coordination_numbers, [counts(s) for s in ends]),
        (np.array(found.internal_energy), [np.array(s.internal_energy) for s in ends]),
    ):
        zero, one, two, three = values
        differences = (-11.0 * zero + 18.0 * one - 9.0 * two + 2.0 * three) / (6.0 * STEP)
        check_slope(slope, differences)


def test_k_and_depth_are_one_direction() -> None:
    """d/dk_ij = -sqrt(eps_i eps_j) d/d eps_ij, from eps_ij = (1 - k_ij) sqrt(eps_i eps_j)."""
    here = moved("rhnc", "k", (0, 1), 0.0)
    by_k, by_depth = sensitivity(here, "k", (0, 1)), sensitivity(here, "well_depth", (1, 0))
    assert by_k.coordination_numbers == pytest.approx(-np.sqrt(1.5) * by_depth.coordination_numbers, rel=1e-9)


@pytest.mark.parametrize(
    ("parameter", "species"),
    [("pressure", ()), ("k", ()), ("k", (0, 0)), ("k", (0, 2)), ("mole_fraction", (0, 1)), ("temperature", (0,))],
)
def test_wrong_directions_are_refused(parameter: str, species: tuple[int, ...]) -> None:
    with pytest.raises(InputError):
        sensitivity(at("msa"), parameter, species)
