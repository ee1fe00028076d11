"""The physical root on one grid: hard-sphere reference, a quick attempt, and the sure way.

Quick: the mean spherical closure at the full depth, loosely, from the hard-sphere mixture, then the
wanted closure from there. It is accepted only with positive definite I - C(k) and when the fixed
point lies on the branch that starts at hard spheres (`on_first_branch`). Otherwise the sure way:
continuation in beta from hard spheres.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from ozsolve.anderson import Anderson
from ozsolve.closures import MSA, PY, Closure
from ozsolve.continuation import Rung, Stride, follow
from ozsolve.equations import Equations, Fluid
from ozsolve.grid import Grid
from ozsolve.iteration import Outcome, iterate
from ozsolve.newton import largest_real_eigenvalue
from ozsolve.oz import eigenvalues_above
from ozsolve.potential import Array
from ozsolve.stopping import Status, StoppingRule

LOOSE = 1e-4
"""Tolerance of stages that only make a start for the next one."""
QUICK_STEPS = 60
"""A quick attempt that is not there by then goes the sure way."""
NEAR_INSTABILITY = 0.2
"""Lowest eigenvalue of I - C below which a quick answer must prove its branch."""
CAVITY_FLOOR = 1e-6
"""Percus-Yevick hard spheres can give a negative cavity function at extreme size ratios; the
logarithm in the bridge function is cut there (reported as a defect)."""


@dataclass
class Root:
    """What was found on one grid.

    Attributes
    ----------
    equations : Equations
        At the requested state.
    x : ndarray, shape (1, size)
        r gamma of the last good point.
    status : Status
    reached : float
        Fraction of the requested beta that was reached; 1 on success.
    reference : ndarray, shape (1, size)
        r gamma of the Percus-Yevick hard-sphere mixture; only a rough start when the closure has no
        use for it.
    residuals : list of float
    """

    equations: Equations
    x: Array
    status: Status
    reached: float
    reference: Array
    residuals: list[float]
    counters: Counters


@dataclass
class Counters:
    """Work done so far; one object is passed along and added to."""

    steps: int = 0
    rungs: list[Rung] = field(default_factory=list)
    restarts: int = 0

    def add(self, outcome: Outcome) -> Outcome:
        """Count an iteration and hand it on."""
        self.steps += len(outcome.residuals)
        self.restarts += outcome.restarts
        return outcome

    def add_rungs(self, rungs: list[Rung]) -> None:
        """Count a path."""
        self.rungs.extend(rungs)
        self.steps += sum(rung.steps for rung in rungs)


def bridge_function(reference: Array, equations: Equations) -> Array:
    """b0 = ln(1 + gamma0) - gamma0 of the Percus-Yevick reference on the grid (Lado 1973)."""
    gamma_0 = equations.gamma(reference)
    return np.log(np.maximum(1.0 + gamma_0, CAVITY_FLOOR)) - gamma_0


def find_root(
    fluid: Fluid,
    grid: Grid,
    closure: Closure,
    rule: StoppingRule,
    stepper: Anderson,
    counters: Counters,
    start: Array | None = None,
    reference_start: Array | None = None,
) -> Root:
    """Solve one state on one grid.

    Parameters
    ----------
    fluid : Fluid
        Batch of one.
    start, reference_start : ndarray, shape (1, size), optional
        Warm starts for the state and for its hard-sphere reference.
    """
    hard = Equations(fluid.scaled(attraction=0.0), grid, PY)
    bridge = None
    if closure.needs_reference:
        reference, status = _hard_spheres(hard, rule, stepper, counters, reference_start)
        if status is Status.SOLVED:
            bridge = bridge_function(reference, hard)
    elif reference_start is not None:
        reference, status = reference_start, Status.SOLVED
    else:  # only a starting point: no need to be precise
        loose = StoppingRule(max(LOOSE, rule.tolerance), rule.max_steps)
        reference, status = _hard_spheres(hard, loose, stepper, counters, None)
    equations = Equations(fluid, grid, closure, bridge)
    if status is not Status.SOLVED:
        return Root(equations, np.zeros_like(reference), status, 0.0, reference, [], counters)
    outcome = _quick(equations, reference, start, rule, stepper, counters)
    if outcome.status is Status.SOLVED and on_first_branch(equations, outcome.x):
        return Root(equations, outcome.x, Status.SOLVED, 1.0, reference, outcome.residuals, counters)
    return _sure(equations, reference, rule, stepper, counters)


def _hard_spheres(
    equations: Equations, rule: StoppingRule, stepper: Anderson, counters: Counters, start: Array | None
) -> tuple[Array, Status]:
    """Percus-Yevick hard spheres, directly or by continuation in the density."""
    x = np.zeros((1, equations.shape[1] * equations.shape[2])) if start is None else start
    outcome = counters.add(iterate(equations, x, rule, stepper))
    if outcome.good:
        return outcome.x, Status.SOLVED

    def at(t: float) -> Equations:
        return Equations(equations.fluid.scaled(density=t), equations.grid, PY)

    path = follow(at, np.zeros_like(x), rule, stepper)
    counters.add_rungs(path.rungs)
    return path.x, path.status


def _quick(
    equations: Equations,
    reference: Array,
    start: Array | None,
    rule: StoppingRule,
    stepper: Anderson,
    counters: Counters,
) -> Outcome:
    brief = StoppingRule(rule.tolerance, QUICK_STEPS)
    if start is None:
        start = reference
        if np.any(equations.fluid.attraction != 0.0) and equations.closure is not MSA:
            loose = StoppingRule(max(LOOSE, rule.tolerance), QUICK_STEPS)
            spherical = Equations(equations.fluid, equations.grid, MSA)
            outcome = counters.add(iterate(spherical, reference, loose, stepper))
            if outcome.status is Status.SOLVED:  # only a start: the answer is judged, not the way to it
                start = outcome.x
    return counters.add(iterate(equations, start, brief, stepper))


def on_first_branch(equations: Equations, x: Array) -> bool:
    """Whether I - G' has no negative real eigenvalue, as on the branch that starts at hard spheres.

    Two solutions merge where the branch ends, and one eigenvalue of I - G' changes sign there. Far
    from instability (all eigenvalues of I - C(k) above `NEAR_INSTABILITY`) nothing is near.
    """
    c_k = equations.direct_from_zero(x)
    if eigenvalues_above(c_k, equations.root_rho, NEAR_INSTABILITY)[0]:
        return True
    return bool(eigenvalues_above(c_k, equations.root_rho, 0.0)[0]) and largest_real_eigenvalue(equations, x) < 1.0


def _sure(equations: Equations, reference: Array, rule: StoppingRule, stepper: Anderson, counters: Counters) -> Root:
    fluid, grid, closure, bridge = equations.fluid, equations.grid, equations.closure, equations.bridge

    def at(t: float) -> Equations:
        return Equations(fluid.scaled(attraction=t), grid, closure, bridge)

    start = counters.add(iterate(at(0.0), reference, rule, stepper))
    if not start.good:
        path = follow(lambda t: Equations(fluid.scaled(attraction=0.0, density=t), grid, closure, bridge),
                      np.zeros_like(reference), rule, stepper)  # fmt: skip
        counters.add_rungs(path.rungs)
        if path.status is not Status.SOLVED:
            return Root(equations, path.x, path.status, 0.0, reference, path.residuals, counters)
        start.x = path.x
    path = follow(at, start.x, rule, stepper, Stride())
    counters.add_rungs(path.rungs)
    return Root(equations, path.x, path.status, path.reached, reference, path.residuals, counters)
