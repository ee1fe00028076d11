"""Time of one binary liquid state per closure, as ratios in one run.

Run with `pytest tests/benchmarks -s`; not collected by default. Baselines:
(a) Picard with the best fixed mixing on a grid without edge correction, refined until its
    coordination numbers are good to 1e-4; only its last, successful grid is timed;
(b) `scipy.optimize.newton_krylov` on our own residual, through the same stages on the fine grid alone;
(c) the bare radial transforms that our iterations need: to k and back, nothing in between.
"""

from __future__ import annotations

import time
from collections.abc import Callable

import numpy as np
import pytest
from scipy.optimize import newton_krylov

from ozsolve import CLOSURES, Mixture, State, solve
from ozsolve.closures import MSA, PY, get_closure
from ozsolve.equations import Equations
from ozsolve.grid import Grid
from ozsolve.root import bridge_function
from ozsolve.solution import reduced_fluid
from ozsolve.solver import RESIDUAL_SHARE
from ozsolve.transform import plan

MIXTURE = Mixture([1.0, 1.5], [1.0, 1.5], k=0.1)
STATE = State(2.0, (0.5, 0.5), packing_fraction=0.40)
ACCURACY = 1e-5
MIXINGS = (0.05, 0.1, 0.15, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8)
PICARD_STEPS = 4000
PICARD_TARGET = 1e-4
AT_LEAST_PICARD, AT_LEAST_KRYLOV, AT_MOST_TRANSFORMS = 100.0, 3.0, 5.0


def median_seconds(call: Callable[[], object], repeats: int = 21) -> float:
    call()
    times = []
    for _ in range(repeats):
        began = time.perf_counter()
        call()
        times.append(time.perf_counter() - began)
    return float(np.median(times))


def bare_seconds(grid: Grid) -> float:
    """One stack of three radial functions to k and back."""
    transform = plan(grid.spacing, grid.points, 3)
    f = np.zeros((3, grid.points - 1))

    def there_and_back() -> None:
        for _ in range(500):
            transform.inverse(transform.forward(f))

    return median_seconds(there_and_back, 11) / 500


class PlainEquations(Equations):
    """The same equations with the potential's steps simply sampled at the grid points."""

    def _indicator(self, edges: np.ndarray) -> np.ndarray:
        return (self.grid.r < edges[..., None]).astype(float)


def picard(equations: Equations, x: np.ndarray, mixing: float, tolerance: float) -> tuple[np.ndarray, int] | None:
    """Fixed mixing from x; None when it does not settle."""
    with np.errstate(all="ignore"):
        for step in range(PICARD_STEPS):
            image, _ = equations.apply(x)
            residual = image - x
            norm = np.abs(residual).max()
            if not norm < 1e6:
                return None
            if norm < tolerance:
                return image, step
            x = x + mixing * residual
    return None


def picard_counts(equations: Equations, x: np.ndarray) -> np.ndarray:
    """Shell integrals by the same plain sampling."""
    gamma = equations.gamma(x)[0]
    attraction = equations.fluid.attraction[0][:, None]
    bridge = np.broadcast_to(equations.bridge, equations.shape)[0]
    g = equations.closure.g(gamma, attraction, bridge)
    return 4.0 * np.pi * equations.grid.spacing * np.sum(equations.well[0] * g * equations.grid.r**2, axis=1)


def stages(kind: type[Equations], closure: str, grid: Grid, run: Callable[[Equations, np.ndarray], np.ndarray]):
    """Hard spheres, then the mean spherical start, then the closure, each by `run`."""
    fluid, _ = reduced_fluid(MIXTURE, STATE)
    hard = kind(fluid.scaled(attraction=0.0), grid, PY)
    x = run(hard, np.zeros((1, 3 * (grid.points - 1))))
    chosen = get_closure(closure)
    bridge = bridge_function(x, hard) if chosen.needs_reference else None
    if chosen is not MSA:
        x = run(kind(fluid, grid, MSA), x)
    last = kind(fluid, grid, chosen, bridge)
    return last, run(last, x)


def picard_baseline(closure: str, truth: np.ndarray) -> tuple[float, float, int, float]:
    """Seconds, mixing, points and count error of the first grid that is good to 1e-4."""
    extent = 17.28
    best = None
    for mixing in MIXINGS:  # the best mixing hardly depends on the spacing: found on a coarse grid
        steps = 0

        def run(equations: Equations, x: np.ndarray, mixing: float = mixing) -> np.ndarray:
            nonlocal steps
            done = picard(equations, x, mixing, 1e-6)
            if done is None:
                raise ArithmeticError
            steps += done[1]
            return done[0]

        try:
            stages(PlainEquations, closure, Grid(extent / 432, 432), run)
        except ArithmeticError:
            continue
        if best is None or steps < best[1]:
            best = (mixing, steps)
    assert best is not None
    mixing = best[0]
    points = 432 * 4
    while True:
        began = time.perf_counter()
        last, x = stages(
            PlainEquations, closure, Grid(extent / points, points),
            lambda e, y: picard(e, y, mixing, 1e-6)[0],  # type: ignore[index]
        )  # fmt: skip
        seconds = time.perf_counter() - began
        error = float(np.abs(picard_counts(last, x) / truth - 1.0).max())
        if error < PICARD_TARGET:
            return seconds, mixing, points, error
        points *= 2


@pytest.mark.parametrize("closure", list(CLOSURES))
def test_one_state(closure: str, capsys: pytest.CaptureFixture[str]) -> None:
    solution = solve(MIXTURE, STATE, closure=closure, accuracy=ACCURACY)
    ours = median_seconds(lambda: solve(MIXTURE, STATE, closure=closure, accuracy=ACCURACY))
    truth = solve(MIXTURE, STATE, closure=closure, accuracy=1e-9).observables.shell_integral[np.triu_indices(2)]
    our_error = float(np.abs(solution.observables.shell_integral[np.triu_indices(2)] / truth - 1.0).max())
    assert our_error < ACCURACY

    picard_seconds, mixing, points, picard_error = picard_baseline(closure, truth)

    grid = Grid(solution.stats.spacing, solution.stats.grid_points)
    tolerance = RESIDUAL_SHARE * ACCURACY

    def krylov(equations: Equations, x: np.ndarray) -> np.ndarray:
        return np.asarray(newton_krylov(lambda y: equations.apply(y)[0] - y, x, f_tol=tolerance, maxiter=200))

    krylov_seconds = median_seconds(lambda: stages(Equations, closure, grid, krylov), repeats=3)

    on_fine = len(solution.residuals)
    fine_cost, coarse_cost = (bare_seconds(g) for g in (grid, Grid(2 * grid.spacing, grid.points // 2)))
    bare = on_fine * fine_cost + (solution.stats.steps - on_fine) * coarse_cost

    with capsys.disabled():
        print(
            f"\n{closure:>5}: {1e3 * ours:6.2f} ms a state, {solution.stats.steps} steps (error {our_error:.1e}) | "
            f"Picard {picard_seconds / ours:7.0f} x ({picard_seconds:.2f} s, mixing {mixing}, {points} points, "
            f"error {picard_error:.1e}) | newton_krylov {krylov_seconds / ours:5.1f} x "
            f"({1e3 * krylov_seconds:.0f} ms) | bare transforms 1/{ours / bare:.2f} ({1e3 * bare:.2f} ms)"
        )
    assert picard_seconds / ours >= AT_LEAST_PICARD
    assert krylov_seconds / ours >= AT_LEAST_KRYLOV
    assert ours / bare <= AT_MOST_TRANSFORMS
