"""The only loop over iterations: drives a stepper until each state of a batch has an end with a name."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ozsolve.anderson import Anderson
from ozsolve.equations import Equations
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
    definite = False
    with np.errstate(all="ignore"):
        for _ in range(rule.max_steps + 1):
            image, smallest = equations.apply(x)
            residual = image - x
            norm = float(np.abs(residual).max())
            residuals.append(norm)
            definite = bool(smallest[0] > 0.0)
            if not np.isfinite(norm):
                return Outcome(x, Status.NONFINITE, residuals, False, history.restarts)
            if norm < rule.tolerance:
                return Outcome(image, Status.SOLVED, residuals, definite, history.restarts)
            best = min(best, norm)
            if norm > rule.growth * best:
                return Outcome(x, Status.DIVERGED, residuals, definite, history.restarts)
            x = stepper.step(image, residual, history)
    return Outcome(x, Status.MAX_STEPS, residuals, definite, history.restarts)
