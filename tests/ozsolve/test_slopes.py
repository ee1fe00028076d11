"""Slopes by implicit differentiation against differences of whole solves."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest

from ozsolve import CLOSURES, Mixture, Solution, State, solve
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
