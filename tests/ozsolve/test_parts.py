"""The solver's parts by their defining properties; one method against another."""

from __future__ import annotations

import copy

import numpy as np
import pytest
from scipy.optimize import newton_krylov

from ozsolve import CLOSURES, Mixture, State, solve
from ozsolve.anderson import Anderson, Recycled
from ozsolve.closures import PY, RHNC, get_closure
from ozsolve.continuation import Stride, follow
from ozsolve.equations import Equations, Fluid, regrid
from ozsolve.grid import STENCIL, Grid, edge_interpolation, good_size, step_weights
from ozsolve.interpolation import Scatter, spread_order
from ozsolve.iteration import iterate, iterate_many
from ozsolve.newton import newton
from ozsolve.response import Response
from ozsolve.root import Counters, find_root
from ozsolve.solution import reduced_fluid
from ozsolve.stopping import Status, StoppingRule
from ozsolve.thermodynamics import observe
from tests.problems import PROBLEMS

RULE = StoppingRule(1e-10, 400)
EDGES = [1.0, 1.2345, 1.5, 0.04, 2.718]


def integral_error(weights: np.ndarray, grid: Grid, edge: float, power: int) -> float:
    """Relative error of int_0^edge r^power dr."""
    found = grid.spacing * float(np.dot(weights, grid.r**power))
    return abs(found / (edge ** (power + 1) / (power + 1)) - 1.0)


@pytest.mark.parametrize("edge", EDGES)
@pytest.mark.parametrize("power", range(1, STENCIL))
def test_step_weights_integrate_polynomials_exactly(edge: float, power: int) -> None:
    """Odd powers exactly (the sum from 0 has no end correction there), even ones to Euler-Maclaurin at 0."""
    grid = Grid(0.0313, 256)
    weights = step_weights(edge, grid.spacing, grid.points)
    origin = 0.0 if power % 2 == 0 else {1: grid.spacing**2 / 12, 3: -grid.spacing**4 / 120, 5: grid.spacing**6 / 252}[
        power
    ]  # fmt: skip
    found = grid.spacing * float(np.dot(weights, grid.r**power)) + origin
    assert found == pytest.approx(edge ** (power + 1) / (power + 1), rel=1e-10, abs=1e-13)


def test_plain_sampling_is_off_by_the_order_of_the_spacing() -> None:
    grid = Grid(0.0313, 256)
    plain = (grid.r < 1.2345).astype(float)
    assert integral_error(plain, grid, 1.2345, 2) > 1e-3
    assert integral_error(step_weights(1.2345, grid.spacing, grid.points), grid, 1.2345, 2) < 1e-9


def test_edge_interpolation_is_exact_for_polynomials() -> None:
    grid = Grid(0.05, 128)
    start, weights = edge_interpolation(1.2345, 0.05, 128)
    for power in range(len(weights)):
        values = grid.r[start : start + len(weights)] ** power
        assert float(weights @ values) == pytest.approx(1.2345**power, rel=1e-11)


def test_good_sizes_are_quick_and_large_enough() -> None:
    for minimum in (5, 100, 257, 300, 1025):
        size = good_size(minimum)
        assert minimum <= size < 1.35 * minimum + 8
        for prime in (2, 3, 5):
            while size % prime == 0:
                size //= prime
        assert size == 1


def test_anderson_keeps_its_secant_promise() -> None:
    """On a linear map of rank r, exact after r + 1 steps; the residual is orthogonal to what was seen."""
    rng = np.random.default_rng(3)
    a = 0.4 * rng.normal(size=(30, 4)) @ rng.normal(size=(4, 30)) / 4
    b = rng.normal(size=30)
    stepper = Anderson(8)
    x = np.zeros((1, 30))
    history = stepper.start(x)
    for _ in range(7):
        image = x @ a.T + b
        x = stepper.step(image, image - x, history)
    assert np.max(np.abs(x @ a.T + b - x)) < 1e-9
    shallow = Anderson(1)
    y = np.zeros((1, 30))
    history = shallow.start(y)
    for _ in range(7):
        image = y @ a.T + b
        y = shallow.step(image, image - y, history)
    assert np.max(np.abs(y @ a.T + b - y)) > 1e-6  # a memory of one is not enough


def check_secant(shift_image: np.ndarray, shift_residual: np.ndarray) -> None:
    """The step's implied inverse Jacobian H obeys H dF_j = dX_j for every remembered pair (Walker and Ni 2011):
    moving the point along a remembered difference does not change where the step lands."""
    rng = np.random.default_rng(21)
    stepper = Anderson(5)
    moves = rng.normal(size=(4, 1, 12))
    images = rng.normal(size=(4, 1, 12))
    history = stepper.start(moves[0])
    for x, image in zip(moves[:3], images[:3], strict=True):
        stepper.step(image, image - x, history)
    again = copy.deepcopy(history)
    image, residual = images[3], images[3] - moves[3]
    landed = stepper.step(image, residual, history)
    moved = stepper.step(image + shift_image, residual + shift_residual, again)
    assert np.max(np.abs(landed - moved)) < 1e-8


def test_anderson_keeps_the_secant_condition_and_promises_no_more() -> None:
    rng = np.random.default_rng(21)
    moves, images = rng.normal(size=(4, 1, 12)), rng.normal(size=(4, 1, 12))
    for j in range(2):
        d_image, d_move = images[j + 1] - images[j], moves[j + 1] - moves[j]
        check_secant(d_image, d_image - d_move)
        with pytest.raises(AssertionError):
            check_secant(1.01 * d_image, d_image - d_move)
    fresh = np.random.default_rng(5).normal(size=(2, 1, 12))
    with pytest.raises(AssertionError):
        check_secant(fresh[0], fresh[1])


def test_recycled_pairs_solve_the_linear_problem_they_came_from() -> None:
    rng = np.random.default_rng(8)
    a = rng.normal(size=(20, 3)) @ rng.normal(size=(3, 20)) / 6
    b = rng.normal(size=20)
    moves = rng.normal(size=(6, 20))
    recycled = Recycled(moves @ a.T - moves, moves @ a.T)
    x = np.linalg.solve(np.eye(20) - a, b) + moves[0] @ np.eye(20)
    image = a @ x + b
    corrected = recycled.correct(image[None], (image - x)[None])[0]
    truth = np.linalg.solve(np.eye(20) - a, b)
    assert np.linalg.norm(corrected - truth) < 1e-6 * np.linalg.norm(image - truth)


def equations(name: str, closure: str, points: int = 256) -> tuple[Equations, np.ndarray]:
    """A problem's equations on a grid of its own, with a start from the solution at 0.9 of the depth."""
    mixture, state = PROBLEMS[name]
    fluid, _ = reduced_fluid(mixture, state)
    grid = Grid((10 * fluid.core.max() + fluid.edge.max()) / points, points)
    chosen = get_closure(closure)
    root = find_root(fluid.scaled(attraction=0.9), grid, chosen, RULE, Anderson(), Counters())
    assert root.status is Status.SOLVED
    bridge = root.equations.bridge if chosen.needs_reference else None
    return Equations(fluid, grid, chosen, bridge), root.x


@pytest.mark.parametrize("closure", list(CLOSURES))
@pytest.mark.parametrize("name", list(PROBLEMS))
def test_derivative_against_differences(name: str, closure: str) -> None:
    system, x = equations(name, closure)
    v = np.random.default_rng(1).normal(size=x.shape)
    step = 1e-6
    ends = [system.apply(x + sign * step * v)[0] for sign in (1.0, -1.0)]
    found = system.derivative(x)(v)
    assert np.max(np.abs(found - (ends[0] - ends[1]) / (2 * step))) < 1e-5 * np.abs(found).max()
    assert np.max(np.abs(1.01 * found - (ends[0] - ends[1]) / (2 * step))) > 1e-5 * np.abs(found).max()


@pytest.mark.parametrize("closure", list(CLOSURES))
@pytest.mark.parametrize("name", list(PROBLEMS))
def test_every_method_reaches_the_same_root(name: str, closure: str) -> None:
    system, start = equations(name, closure)
    one = iterate(system, start, RULE, Anderson())
    two = newton(system, start, RULE)
    batch = iterate_many(system, start, RULE, Anderson())
    assert one.good
    assert two.good
    assert batch.solved[0]
    assert np.max(np.abs(one.x - two.x)) < 1e3 * RULE.tolerance
    assert np.max(np.abs(one.x - batch.x)) < 1e3 * RULE.tolerance
    assert len(two.residuals) <= len(one.residuals)  # Newton's steps are fewer (and dearer)


@pytest.mark.parametrize("closure", list(CLOSURES))
@pytest.mark.parametrize("name", ["one component", "unlike", "ternary", "shoulder"])
def test_scipy_reaches_the_same_root(name: str, closure: str) -> None:
    system, start = equations(name, closure, 192)
    ours = iterate(system, start, RULE, Anderson()).x
    theirs = newton_krylov(lambda y: system.apply(y)[0] - y, start, f_tol=1e-9)
    assert np.max(np.abs(ours - theirs)) < 1e-6
    assert np.max(np.abs(start - theirs)) > 1e-3  # the start is not the answer


def test_picard_reaches_the_same_root() -> None:
    system, x = equations("unlike", "msa", 192)
    truth = iterate(system, x, RULE, Anderson()).x
    for _ in range(1500):
        x = x + 0.6 * (system.apply(x)[0] - x)
    assert np.max(np.abs(x - truth)) < 1e-6


def test_a_step_limit_and_a_nan_are_named() -> None:
    system, start = equations("unlike", "rhnc", 192)
    assert iterate(system, start, StoppingRule(1e-10, 3), Anderson()).status is Status.MAX_STEPS
    assert iterate(system, start * np.nan, RULE, Anderson()).status is Status.NONFINITE
    batch = iterate_many(system, start * np.nan, RULE, Anderson())
    assert not batch.good[0]


def test_the_solution_of_the_last_step_is_looked_at() -> None:
    """With just enough steps the result is reported as solved, not as one step short."""
    system, start = equations("unlike", "rhnc", 192)
    needed = len(iterate(system, start, RULE, Anderson()).residuals) - 1
    assert iterate(system, start, StoppingRule(RULE.tolerance, needed), Anderson()).status is Status.SOLVED
    assert iterate(system, start, StoppingRule(RULE.tolerance, needed - 1), Anderson()).status is Status.MAX_STEPS


def test_a_path_names_the_end_of_its_branch() -> None:
    fluid, _ = reduced_fluid(Mixture([1.0, 1.0], [1.0, 1.0], k=0.2), State(1.0, (0.5, 0.5), packing_fraction=0.4))
    grid = Grid(0.06, 192)

    def at(t: float) -> Equations:
        return Equations(fluid.scaled(attraction=t), grid, PY)

    start = iterate(at(0.0), np.zeros((1, 3 * 191)), RULE, Anderson()).x
    path = follow(at, start, RULE, Anderson(), Stride())
    assert path.status in (Status.BRANCH_END, Status.UNSTABLE_FLUID)
    assert 0.7 < path.reached < 0.78
    assert path.rungs[-1].status is not None
    assert len(path.rungs) <= Stride().max_rungs


def test_regrid_keeps_the_function() -> None:
    system, start = equations("unlike", "rhnc", 192)
    old = system.grid
    fine = Grid(old.spacing / 2, 2 * old.points)
    back = regrid(regrid(start, 3, old, fine), 3, fine, old)
    assert np.max(np.abs(back - start)) < 0.02 * np.abs(start).max()  # filtered twice near the origin's cusp
    wide = Grid(old.spacing, 2 * old.points)
    assert np.array_equal(regrid(regrid(start, 3, old, wide), 3, wide, old), start)
    with pytest.raises(ValueError, match="not both"):
        regrid(start, 3, old, Grid(old.spacing / 2, 3 * old.points))


DIRECTIONS = {
    "unlike depth (k)": lambda f, t: Fluid(f.rho, f.core, f.edge, f.attraction * np.array([[1.0, 1.0 + t, 1.0]])),
    "depth of species 2": lambda f, t: Fluid(f.rho, f.core, f.edge, f.attraction + t * np.array([[0.0, 0.0, 1.0]])),
    "temperature": lambda f, t: f.scaled(attraction=1.0 / (1.0 + t)),
    "density": lambda f, t: f.scaled(density=1.0 + t),
    "composition": lambda f, t: Fluid(f.rho + t * f.rho.sum() * np.array([[1.0, -1.0]]), f.core, f.edge, f.attraction),
}


@pytest.mark.parametrize("direction", list(DIRECTIONS))
@pytest.mark.parametrize("closure", list(CLOSURES))
def test_implicit_derivatives_against_differences(closure: str, direction: str) -> None:
    """Coordination integrals and energy, by every parameter, to 1e-4."""
    move = DIRECTIONS[direction]
    solution = solve(*PROBLEMS["unlike"], closure=closure, accuracy=1e-8)
    level = solution.fine
    response = Response(level.equations, level.x, level.reference, lambda t: move(level.fluid, t))
    step, ends = 2e-4, []
    for sign in (1.0, -1.0):
        root = find_root(
            move(level.fluid, sign * step), level.grid, level.closure, StoppingRule(1e-11, 300), Anderson(), Counters(),
            level.x, level.reference,
        )  # fmt: skip
        assert root.status is Status.SOLVED
        ends.append(observe(root.equations, root.x))
    for name in ("shell_integral", "energy"):
        difference = (np.asarray(getattr(ends[0], name)) - np.asarray(getattr(ends[1], name))) / (2 * step)
        found = np.asarray(response.slope(name))
        scale = np.abs(difference).max()
        assert np.max(np.abs(found - difference)) < 1e-4 * scale
        assert np.max(np.abs(1.001 * found - difference)) > 1e-4 * scale


def test_scattered_interpolation_goes_through_its_points_and_between_them() -> None:
    rng = np.random.default_rng(2)
    points = rng.uniform(0.2, 1.0, (30, 3))
    scatter = Scatter()
    assert scatter.at(points[0]) is None
    for p in points:
        scatter.add(p, np.array([np.sin(p.sum()), p[0] * p[1]]))
    for p in rng.uniform(0.3, 0.9, (10, 3)):
        found = scatter.at(p)
        assert found is not None
        assert np.max(np.abs(found - [np.sin(p.sum()), p[0] * p[1]])) < 1e-2


def test_spread_order_covers_early() -> None:
    points = np.linspace(0.0, 1.0, 21)[:, None]
    order = spread_order(points)
    assert sorted(order) == list(range(21))
    assert set(order[:3]) == {0, 20, 10}


def test_rhnc_is_the_default_and_closures_are_listed_once() -> None:
    assert get_closure("RHNC") is RHNC
    assert solve(*PROBLEMS["one component"]).closure is RHNC
    assert list(CLOSURES) == ["msa", "py", "hnc", "rhnc"]
    for closure in CLOSURES.values():
        assert closure.source
