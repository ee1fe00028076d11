"""The energy route against closed forms: hard spheres, low density, and its own energy."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any, cast

import numpy as np
import pytest

from localcomp.energyroute import EnergyRoute, energy_route, is_additive, route_disagreement
from localcomp.errors import NoAnswer
from ozsolve import CLOSURES, Mixture, PairOverride, State, solve

ETAS = (0.1, 0.3, 0.45)


@pytest.mark.parametrize("eta", ETAS)
def test_hard_spheres_are_carnahan_starling(eta):
    """Z = (1 + eta + eta^2 - eta^3)/(1 - eta)^3: Carnahan and Starling, J. Chem. Phys. 51 (1969) 635."""
    route = energy_route(Mixture(1.7, 0.0), State(1.0, packing_fraction=eta), "py")
    assert route.z == pytest.approx((1.0 + eta + eta**2 - eta**3) / (1.0 - eta) ** 3, rel=1e-14)


@pytest.mark.parametrize("eta", ETAS)
def test_another_equation_of_state_fails_that_check(eta):
    """Percus-Yevick, compressibility route: (1 + eta + eta^2)/(1 - eta)^3 (Wertheim 1963)."""
    z = energy_route(Mixture(1.7, 0.0), State(1.0, packing_fraction=eta), "py").z
    assert z != pytest.approx((1.0 + eta + eta**2) / (1.0 - eta) ** 3, rel=1e-4)


def second_virial_part(eps_over_kt: float, lam: float) -> float:
    """Attraction part of B2 sigma^-3 of a square well, -(2 pi/3)(lam^3 - 1)(exp(eps/kT) - 1):
    Kihara, Rev. Mod. Phys. 25 (1953) 831."""
    return -2.0 * math.pi / 3.0 * (lam**3 - 1.0) * math.expm1(eps_over_kt)


@pytest.mark.parametrize("closure", ["py", "hnc", "rhnc"])
@pytest.mark.parametrize("lam", [1.3, 1.8])
def test_at_low_density_the_attraction_is_the_second_virial_coefficient(closure, lam):
    rho = 1e-6
    route = energy_route(Mixture(1.0, 1.0, lam), State(1.25, density=rho), closure, 1e-7)
    expected = rho * second_virial_part(0.8, lam)
    assert route.helmholtz_attraction == pytest.approx(expected, rel=1e-4)
    assert route.z_attraction == pytest.approx(expected, rel=1e-4)


def test_the_mean_spherical_closure_fails_that_check():
    """Its low-density energy is 1 + beta eps in place of exp(beta eps)."""
    rho = 1e-6
    route = energy_route(Mixture(1.0, 1.0, 1.5), State(1.25, density=rho), "msa", 1e-7)
    assert route.helmholtz_attraction != pytest.approx(rho * second_virial_part(0.8, 1.5), rel=0.02)


@pytest.mark.parametrize("closure", CLOSURES)
def test_slopes_are_the_energy_and_the_pressure(closure):
    """A/(NkT) integrates U/N over beta: d/d ln beta gives U/(NkT), d/d ln rho gives Z - Z of hard spheres."""
    mixture, state = Mixture([1.0, 1.3], [1.0, 1.4], k=0.05), State(2.0, (0.4, 0.6), packing_fraction=0.38)

    def helmholtz(**changes: float) -> float:
        return energy_route(mixture, replace(state, **cast(Any, changes)), closure, 1e-7).helmholtz_attraction

    step = 2e-3
    by_beta = (helmholtz(temperature=2.0 / (1 + step)) - helmholtz(temperature=2.0 / (1 - step))) / (2 * step)
    u = solve(mixture, state, closure=closure, accuracy=1e-7).internal_energy / 2.0
    assert by_beta == pytest.approx(u, rel=1e-5)
    denser, thinner = (helmholtz(packing_fraction=0.38 * (1 + s)) for s in (step, -step))
    route = energy_route(mixture, state, closure, 1e-7)
    assert route.z_attraction == pytest.approx((denser - thinner) / (2 * step), rel=2e-4)
    assert route.z_attraction != pytest.approx(u, rel=0.01), "the two slopes are different things"


@pytest.mark.parametrize("temperature", [0.9, 2.0])
def test_six_points_are_enough(temperature):
    mixture, state = Mixture(1.0, 1.0), State(temperature, packing_fraction=0.4)
    six, ten = (energy_route(mixture, state, "rhnc", 1e-7, points) for points in (6, 10))
    assert six.z == pytest.approx(ten.z, abs=1e-5)
    assert six.helmholtz_attraction == pytest.approx(ten.helmholtz_attraction, abs=1e-6)
    one = energy_route(mixture, state, "rhnc", 1e-7, 1)
    assert abs(one.z - ten.z) > 1e-5, "one point is not, so the check can fail"


def test_only_additive_diameters():
    bent = Mixture([1.0, 1.2], [1.0, 1.0], overrides=[PairOverride(0, 1, diameter=1.15)])
    assert is_additive(Mixture([1.0, 1.2, 1.7], [1.0, 1.0, 0.0]))
    assert not is_additive(bent)
    with pytest.raises(NoAnswer, match="additive"):
        energy_route(bent, State(2.0, (0.5, 0.5), packing_fraction=0.3), "rhnc")


def test_a_path_without_solution_is_said_so():
    with pytest.raises(NoAnswer, match=r"path in beta.*followed from hard spheres"):
        energy_route(Mixture(1.0, 1.0), State(0.4, packing_fraction=0.2), "rhnc")


def test_disagreement_of_the_routes():
    mixture, state = Mixture(1.0, 1.0), State(1.5, packing_fraction=0.4)
    solution = solve(mixture, state, closure="py")
    route = energy_route(mixture, state, "py")
    assert route_disagreement(solution, route) == pytest.approx(solution.virial_z - route.z)
    cold = solve(mixture, State(0.3, packing_fraction=0.2), closure="py", on_failure="return")
    assert np.isnan(route_disagreement(cold, EnergyRoute(0.0, 1.0, 0.0)))
