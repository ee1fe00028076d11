"""The loops over iterations: drive a stepper until a state, or each state of a batch, has an end with a name.

One state and a batch have a loop each: the one keeps the residual history and stops as a whole, the
other lets states leave as they finish.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from ozsolve.anderson import Anderson, History, Recycled
from ozsolve.equations import Equations
from ozsolve.oz import smallest_pivot
from ozsolve.potential import Array
from ozsolve.stopping import Status, StoppingRule


@dataclass
class Outcome:
    """End of an iteration of one state.

    Attributes
    ----------
    x : ndarray, shape (1, size)
        r gamma at the last step.
    status : Status
    residuals : list of float
        max |G(x) - x| at every step, the starting one first.
    equations : Equations
        What was iterated.
    restarts : int
        Times the accelerator threw its history away.
    """

    x: Array
    status: Status
    residuals: list[float]
    equations: Equations
    restarts: int = 0

    @cached_property
    def definite(self) -> bool:
        """Whether I - C(k) is positive definite at every k for the last x; worked out when asked."""
        return bool(self.equations.definite(self.x)[0])

    @property
    def good(self) -> bool:
        """Converged on a root with positive definite I - C(k)."""
        return self.status is Status.SOLVED and self.definite


def iterate(equations: Equations, x: Array, rule: StoppingRule, stepper: Anderson) -> Outcome:
    """Iterate one state (batch of one) to its end.

    Parameters
    ----------
    x : ndarray, shape (1, size)
        Start.
    """
    history = stepper.start(x)
    residuals: list[float] = []
    best = np.inf
    status = Status.MAX_STEPS
    with np.errstate(all="ignore"):
        for _ in range(rule.max_steps + 1):
            image, _ = equations.apply(x)
            residual = image - x
            norm = max(float(residual.max()), -float(residual.min()))
            residuals.append(norm)
            if not norm < np.inf:
                status = Status.NONFINITE
                break
            if norm < rule.tolerance:
                status, x = Status.SOLVED, image
                break
            best = min(best, norm)
            if norm > rule.growth * best:
                status = Status.DIVERGED
                break
            x = stepper.step(image, residual, history)
    return Outcome(x, status, residuals, equations, history.restarts)


@dataclass
class BatchOutcome:
    """End of an iteration of a batch of b states.

    Attributes
    ----------
    x : ndarray, shape (b, size)
    solved, definite : ndarray of bool, shape (b,)
        Converged; I - C(k) positive definite at every grid point in k (k = 0 is left to the caller).
    steps : ndarray of int, shape (b,)
        Evaluations of the map until the state left.
    residuals : ndarray, shape (b,)
        max |G(x) - x| at the last step.
    secants : list
        (dF, dG) of each state, each (depth, size), when captured.
    """

    x: Array
    solved: NDArray[np.bool_]
    definite: NDArray[np.bool_]
    steps: NDArray[np.int64]
    residuals: Array
    secants: list[tuple[Array, Array] | None]

    @property
    def good(self) -> NDArray[np.bool_]:
        """Converged with positive definite I - C(k)."""
        return self.solved & self.definite


LEAVE_SHARE = 0.4
"""The batch is rebuilt without its finished states when they are this share of it: rebuilding costs
about one step, dragging a finished state along costs its share of every step."""


def iterate_many(
    equations: Equations,
    x: Array,
    rule: StoppingRule,
    stepper: Anderson,
    recycled: Recycled | None = None,
    capture: bool = False,
    memory: Sequence[tuple[Array, Array] | None] | None = None,
) -> BatchOutcome:
    """Iterate a batch; states leave as they converge or fail, each by its own residual.

    Parameters
    ----------
    x : ndarray, shape (b, size)
        Starts.
    recycled : Recycled, optional
        Secant pairs of a neighbour of all these states.
    capture : bool
        Keep every state's secant pairs in the outcome.
    memory : sequence of (dF, dG) or None, optional
        Secant pairs each state begins with.
    """
    batch = len(x)
    out = BatchOutcome(
        x.copy(), np.zeros(batch, bool), np.zeros(batch, bool), np.zeros(batch, np.int64), np.full(batch, np.inf),
        [None] * batch,
    )  # fmt: skip
    active = np.arange(batch)
    still_open = np.ones(batch, bool)
    best = np.full(batch, np.inf)
    history = stepper.start(x) if memory is None else stepper.primed(x, memory)
    with np.errstate(all="ignore"):
        for step in range(1, rule.max_steps + 2):
            image, pivots = equations.apply(x)
            residual = image - x
            norm = np.maximum(residual.max(axis=1), -residual.min(axis=1))
            best = np.fmin(best, norm)
            done = still_open & (norm < rule.tolerance)
            lost = still_open & ~(norm <= rule.growth * best)
            ended = done | lost
            if ended.any():
                rows = active[ended]
                out.x[rows] = image[ended]
                out.steps[rows], out.residuals[rows] = step, norm[ended]
                out.solved[rows] = done[ended]
                if capture:
                    _capture(out, history, active, done)
                out.definite[rows] = smallest_pivot([pivot[ended] for pivot in pivots]) > 0.0
                still_open &= ~ended
                remaining = int(still_open.sum())
                if remaining == 0:
                    return out
                if lost.any() or remaining <= (1.0 - LEAVE_SHARE) * len(active):
                    keep = np.flatnonzero(still_open)
                    equations = equations.take(keep)
                    history.keep(keep)
                    active, best = active[keep], best[keep]
                    image, residual, x = image[keep], residual[keep], x[keep]
                    still_open = np.ones(len(keep), bool)
            if recycled is not None:
                image = recycled.correct(image, residual)
                residual = image - x
            x = stepper.step(image, residual, history)
    out.steps[active[still_open]] = rule.max_steps + 1
    return out


def _capture(out: BatchOutcome, history: History, active: NDArray[np.int64], done: NDArray[np.bool_]) -> None:
    used = min(max(history.filled, 0), history.d_residual.shape[1])
    for row in np.flatnonzero(done):
        pairs = history.d_residual[row, :used].copy(), history.d_image[row, :used].copy()
        out.secants[active[row]] = pairs if used else None
