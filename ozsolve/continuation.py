"""Warm-started paths with adaptive steps: from a solved start towards a target, never past a branch end.

The path parameter t runs from 0 to 1; what it scales (depths, densities) is the caller's choice. A
rung is accepted when it converges with positive definite I - C(k) and lies where the rungs before
it point; otherwise the step is halved. When the step falls below `shortest` the branch has ended.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

from ozsolve.anderson import Anderson
from ozsolve.equations import Equations
from ozsolve.iteration import Outcome, iterate
from ozsolve.newton import newton
from ozsolve.oz import lowest_eigenvalue
from ozsolve.potential import Array
from ozsolve.stopping import Status, StoppingRule

STABILITY_FLOOR = 0.02
"""Lowest eigenvalue of I - C below which a branch that ends is said to end at the stability limit."""

NO_JUMP = 1e-3
"""Change of r gamma (smallest diameter) that no jump between roots is smaller than, a branch end apart."""
STALLED = 50
"""A path out of rungs whose step has shrunk to this many shortest steps is at the end of its branch."""


@dataclass(frozen=True)
class Rung:
    """One step of a path: where it was, how it ended, and what it cost."""

    t: float
    status: Status
    steps: int


@dataclass
class Path:
    """The walk along a branch.

    Attributes
    ----------
    x : ndarray
        Solution at `reached`.
    reached : float
        Largest t solved; 1 at full success.
    status : Status
    rungs : list of Rung
    residuals : list of float
        History of the last rung.
    """

    x: Array
    reached: float
    status: Status
    rungs: list[Rung] = field(default_factory=list)
    residuals: list[float] = field(default_factory=list)


@dataclass(frozen=True)
class Stride:
    """Step control of a path."""

    first: float = 0.25
    shortest: float = 5e-4
    growth: float = 1.6
    bend: float = 0.5
    max_rungs: int = 60
    rung_tolerance: float = 1e-6
    rung_steps: int = 80


def follow(
    equations_at: Callable[[float], Equations],
    x: Array,
    rule: StoppingRule,
    stepper: Anderson,
    stride: Stride = Stride(),
    begin: float = 0.0,
) -> Path:
    """Walk from the solution x at t = begin to t = 1.

    Parameters
    ----------
    equations_at : callable
        t -> the equations there.
    x : ndarray, shape (1, size)
        Solution at `begin`.
    """
    path = Path(x, begin, Status.SOLVED)
    previous: tuple[float, Array] | None = None
    step = stride.first
    while path.reached < 1.0:
        exhausted = len(path.rungs) >= stride.max_rungs
        if exhausted and step > STALLED * stride.shortest:
            path.status = Status.MAX_STEPS
            return path
        if exhausted or step < stride.shortest:
            path.status = _name_the_end(equations_at, path)
            return path
        t = min(path.reached + step, 1.0)
        equations = equations_at(t)
        guess = path.x
        if previous is not None:
            back_t, back_x = previous
            guess = path.x + (path.x - back_x) * ((t - path.reached) / (path.reached - back_t))
        stop = rule if t == 1.0 else StoppingRule(max(rule.tolerance, stride.rung_tolerance), stride.rung_steps)
        outcome = _correct(equations, guess, stop, stepper, careful=step < 16 * stride.shortest)
        path.rungs.append(Rung(t, outcome.status, len(outcome.residuals)))
        path.residuals = outcome.residuals
        if outcome.good and (previous is None or _continuous(outcome.x, guess, path.x, stride.bend)):
            previous = (path.reached, path.x)
            path.x, path.reached = outcome.x, t
            step *= stride.growth
        else:
            step = 0.5 * (t - path.reached)
    return path


def _correct(equations: Equations, guess: Array, rule: StoppingRule, stepper: Anderson, careful: bool) -> Outcome:
    outcome = iterate(equations, guess, rule, stepper)
    if careful and not outcome.good:
        return newton(equations, guess, rule)
    return outcome


def _continuous(found: Array, guess: Array, before: Array, bend: float) -> bool:
    """Whether the rung lies where the rungs before it point: |found - guess| <= bend |found - before|,
    a change too small to be a jump (`NO_JUMP`) aside."""
    off, moved = float(np.abs(found - guess).max()), float(np.abs(found - before).max())
    return off <= max(bend * moved, NO_JUMP)


def _name_the_end(equations_at: Callable[[float], Equations], path: Path) -> Status:
    equations = equations_at(path.reached)
    lowest = float(lowest_eigenvalue(equations.direct_from_zero(path.x), equations.root_rho)[0])
    return Status.UNSTABLE_FLUID if lowest < STABILITY_FLOOR else Status.BRANCH_END
