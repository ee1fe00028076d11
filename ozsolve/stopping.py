"""When to stop, and what the end is called."""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum


class Status(Enum):
    """How a solve ended. The value is the word used in files; `sentence` says what to try."""

    SOLVED = "solved"
    ACCURACY_NOT_REACHED = "accuracy_not_reached"
    UNSTABLE_FLUID = "unstable_fluid"
    BRANCH_END = "branch_end"
    MAX_STEPS = "max_steps"
    DIVERGED = "diverged"
    NONFINITE = "nonfinite"

    @property
    def sentence(self) -> str:
        """One readable sentence."""
        return _SENTENCES[self]

    @property
    def usable(self) -> bool:
        """Whether the numbers of the solution may be used (within their error bars)."""
        return self in (Status.SOLVED, Status.ACCURACY_NOT_REACHED)


_SENTENCES = {
    Status.SOLVED: "The physical root was found.",
    Status.ACCURACY_NOT_REACHED: "The physical root was found, but the grid limit was met before the requested "
    "accuracy; the error bars say what was reached.",
    Status.UNSTABLE_FLUID: "On the way to this state the homogeneous fluid reaches its stability limit "
    "(a long-wavelength structure factor diverges); beyond it this closure has no physical solution.",
    Status.BRANCH_END: "On the way to this state the branch of physical solutions ends while the fluid is still "
    "stable; beyond that point this closure has no physical solution. Another closure may have one.",
    Status.MAX_STEPS: "The step limit was met before convergence; a larger limit or a neighbouring start may help.",
    Status.DIVERGED: "The iteration left the neighbourhood of its start; a closer starting point may help.",
    Status.NONFINITE: "The iteration met a number that is not finite; a closer starting point may help.",
}


@dataclass(frozen=True)
class StoppingRule:
    """Converged when max |G(x) - x| < tolerance, with x = r gamma in the smallest diameter.

    The residual is that of the map itself, before any mixing. Diverged when it exceeds `growth`
    times the best so far.
    """

    tolerance: float = 1e-8
    max_steps: int = 200
    growth: float = 1e4
