"""The physical branch: where it exists, where it ends, and nothing else accepted."""

from __future__ import annotations

import numpy as np
import pytest

from ozsolve import CLOSURES, Mixture, NotConverged, Solution, State, Status, solve
from ozsolve.anderson import Anderson
from ozsolve.closures import PY, get_closure
from ozsolve.continuation import Stride, follow
from ozsolve.equations import Equations
from ozsolve.iteration import iterate
from ozsolve.newton import largest_real_eigenvalue
from ozsolve.oz import pair_index
from ozsolve.root import Counters, bridge_function, find_root
from ozsolve.solution import reduced_fluid
from ozsolve.solver import first_grid
from ozsolve.stopping import StoppingRule
from tests.problems import random_liquids

FRACTIONS = [0.01, 0.3, 0.5, 0.7, 0.99]
RULE = StoppingRule(1e-8, 300)


def check_physical(solution: Solution) -> None:
    assert solution.status is Status.SOLVED
    assert solution.lowest_eigenvalue > 0.0
    full = np.moveaxis(solution.structure_factors, -1, 0)
    assert np.linalg.eigvalsh(full).min() > 0.0


def check_definite(equations: Equations, x: np.ndarray) -> None:
    """I - C(k) positive definite at every k, by numpy's eigenvalues."""
    rho = equations.fluid.rho[0]
    root = np.sqrt(rho)
    c = np.moveaxis(equations.direct_from_zero(x)[0][np.array(pair_index(len(rho)))], -1, 0)
    assert np.linalg.eigvalsh(np.eye(len(rho)) - root[:, None] * root * c).min() > 0.0


@pytest.mark.parametrize("closure", list(CLOSURES))
@pytest.mark.parametrize("x", FRACTIONS)
@pytest.mark.parametrize(
    ("mixture", "temperature"),
    [(Mixture([1.0, 1.0], [1.0, 2.0]), 1.5), (Mixture([1.0, 1.5], [1.0, 1.5], k=0.1), 1.2)],
    ids=["energies", "sizes"],
)
def test_all_closures_reach_a_physical_root(closure: str, x: float, mixture: Mixture, temperature: float) -> None:
    solution = solve(mixture, State(temperature, (x, 1.0 - x), packing_fraction=0.40), closure=closure)
    check_physical(solution)
    check_definite(solution.fine.equations, solution.fine.x)


DEMIXING = Mixture([1.0, 1.0], [1.0, 1.0], k=0.2)
COLD = State(1.0, (0.5, 0.5), packing_fraction=0.40)


def check_ratio(closure: str) -> None:
    """R_12 = N_12 x_1/(N_11 x_2) = 0.858 in MSA (own calculation, independent of this program)."""
    k = solve(DEMIXING, COLD, closure=closure).observables.shell_integral
    assert k[0, 1] / k[0, 0] == pytest.approx(0.858, abs=1e-3)


def test_msa_ratio_near_demixing() -> None:
    check_ratio("msa")
    with pytest.raises(AssertionError):
        check_ratio("rhnc")


def test_py_says_where_its_branch_ends() -> None:
    with pytest.raises(NotConverged) as caught:
        solve(DEMIXING, COLD, closure="py")
    failed = caught.value.solution
    assert failed.status in (Status.BRANCH_END, Status.UNSTABLE_FLUID)
    end = failed.branch_end_temperature
    assert end is not None
    assert f"{end:.5g}" in failed.message
    assert np.isnan(failed.internal_energy)
    above = State(1.001 * end, (0.5, 0.5), packing_fraction=0.40)
    below = State(0.997 * end, (0.5, 0.5), packing_fraction=0.40)
    check_physical(solve(DEMIXING, above, closure="py"))
    assert not solve(DEMIXING, below, closure="py", on_failure="return").status.usable


def test_a_false_root_is_recognised() -> None:
    """Cold starts far below the branch end: whatever an iteration converges to there is not accepted."""
    state = State(1.0, (0.5, 0.5), packing_fraction=0.40)
    fluid, _ = reduced_fluid(DEMIXING, state)
    grid = first_grid(fluid, 1e-5)
    equations = Equations(fluid, grid, PY)
    rng = np.random.default_rng(4)
    converged = 0
    for _ in range(40):
        size = equations.shape[1] * equations.shape[2]
        shape = np.tile(grid.r * np.exp(-rng.uniform(0.5, 2.0) * grid.r), equations.shape[1])
        start = rng.uniform(0.0, 8.0) * shape[None, :size]
        outcome = iterate(equations, start, RULE, Anderson())
        converged += outcome.status is Status.SOLVED
        assert not outcome.good
        if outcome.status is Status.SOLVED:
            with pytest.raises(AssertionError):
                check_definite(equations, outcome.x)
    assert converged > 0, "no start converged: the test has lost its subject"


@pytest.mark.parametrize("case", list(random_liquids(32, seed=77)), ids=lambda c: c[2])
def test_fine_continuation_from_hard_spheres_gives_the_same_root(case: tuple[Mixture, State, str]) -> None:
    mixture, state, name = case
    solution = solve(mixture, state, closure=name, on_failure="return")
    fluid, _ = reduced_fluid(mixture, state)
    grid, closure = solution.fine.equations.grid, get_closure(name)
    hard = Equations(fluid.scaled(attraction=0.0), grid, PY)
    reference = iterate(hard, np.zeros((1, hard.shape[1] * hard.shape[2])), RULE, Anderson())
    bridge = bridge_function(reference.x, hard) if closure.needs_reference else None

    def at(t: float) -> Equations:
        return Equations(fluid.scaled(attraction=t), grid, closure, bridge)

    start = iterate(at(0.0), reference.x, RULE, Anderson())
    assert start.good
    path = follow(at, start.x, RULE, Anderson(), Stride(first=0.02, growth=1.0, max_rungs=200))
    if not solution.status.usable:
        assert path.status is not Status.SOLVED
        return
    assert path.status is Status.SOLVED
    assert len(path.rungs) >= 50
    assert np.max(np.abs(path.x - solution.fine.x)) < 1e-5 * np.abs(path.x).max()
    assert largest_real_eigenvalue(at(1.0), path.x) < 1.0


def test_work_is_bounded_and_the_end_has_a_name() -> None:
    """Deep in the two-phase region every closure ends with a name, in bounded work."""
    for closure in CLOSURES:
        failed = solve(Mixture(1.0, 1.0), State(0.6, packing_fraction=0.15), closure=closure, on_failure="return")
        assert failed.status in (Status.UNSTABLE_FLUID, Status.BRANCH_END)
        assert failed.stats.steps < 20_000
        assert failed.branch_end_temperature is not None
        assert 0.6 < failed.branch_end_temperature < 3.0
        assert failed.status.sentence in failed.message


DENSE = [
    (Mixture(1.0, 0.0), State(1.0, packing_fraction=0.52), 1e-5),
    (Mixture([1.0, 1.5], [0.0, 0.0]), State(1.0, (0.5, 0.5), packing_fraction=0.48), 1e-4),
]
"""Hypernetted chain; on the first coarse grid for these accuracies the equations have a branch end of their own."""


@pytest.mark.parametrize(("mixture", "state", "accuracy"), DENSE, ids=["default", "1e-4"])
def test_a_branch_end_of_the_coarse_grid_alone_is_no_verdict(mixture: Mixture, state: State, accuracy: float) -> None:
    """The answer is the one that a finer first grid gives."""
    found = solve(mixture, state, closure="hnc", accuracy=accuracy)
    check_physical(found)
    finer = solve(mixture, state, closure="hnc", accuracy=1e-7)
    assert found.virial_z == pytest.approx(finer.virial_z, rel=1e-3)
    fluid, _ = reduced_fluid(mixture, state)
    rule, grid = StoppingRule(1e-7), first_grid(fluid, accuracy)
    alone = find_root(fluid, grid, get_closure("hnc"), rule, Anderson(), Counters())
    assert alone.status is not Status.SOLVED, "the coarse grid alone copes: the test has lost its subject"
