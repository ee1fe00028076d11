"""The only loop over iterations: drives a stepper until each state of a batch has an end with a name."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ozsolve.anderson import Anderson
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
    definite : bool
        Whether I - C(k) is positive definite at every k for the last x.
    restarts : int
        Times the accelerator threw its history away.
    """

    x: Array
    status: Status
    residuals: list[float]
    definite: bool
    restarts: int = 0

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
    pivots: list[Array] = []
    with np.errstate(all="ignore"):
        for _ in range(rule.max_steps + 1):
            image, pivots = equations.apply(x)
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
        definite = status is not Status.NONFINITE and bool(smallest_pivot(pivots)[0] > 0.0)
    return Outcome(x, status, residuals, definite, history.restarts)
