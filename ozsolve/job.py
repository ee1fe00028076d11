"""What all batches of one `solve_many` share; what becomes of a solved state; further refinement."""

from __future__ import annotations

import time
from collections.abc import Sequence
from dataclasses import dataclass, field, replace

import numpy as np

from ozsolve.anderson import Anderson
from ozsolve.closures import PY, Closure
from ozsolve.equations import Equations, Fluid, regrid
from ozsolve.grid import Grid
from ozsolve.iteration import iterate_many
from ozsolve.mixture import Mixture, State
from ozsolve.oz import eigenvalues_above
from ozsolve.potential import Array, Flags
from ozsolve.root import LOOSE, NEAR_INSTABILITY, QUICK_STEPS, bridge_function, on_first_branch
from ozsolve.solution import LevelResult, Solution, Stats
from ozsolve.solver import (
    COARSE_TOLERANCE_FACTOR,
    MAX_POINTS,
    MAX_REFINEMENTS,
    REFINEMENT,
    RESIDUAL_GAIN,
    TAIL_SHARE,
    residual_tolerance,
    tail,
)
from ozsolve.stopping import Status, StoppingRule
from ozsolve.thermodynamics import COUNT_SHARE, ERROR_SHARE, Observables, observe_many

BATCH = 32
"""States in a batch: larger ones are no faster, smaller ones pay more for the interpreter."""
BRIEF_STEPS = 24
"""Steps from a good start; a state that needs more waits for a better one, so as not to hold up its batch."""


@dataclass(frozen=True)
class Attempt:
    """One state solved on two grids, before anyone has judged it."""

    number: int
    coarse: LevelResult
    fine: LevelResult
    sharp: Observables
    roughness: float
    tail: float
    steps: int
    residual: float
    seconds: float


@dataclass
class Job:
    """What all batches of one call share.

    Attributes
    ----------
    cases, fluids, lengths :
        The states, in the caller's units and reduced.
    results : list
        Solutions so far, None where there is none.
    too_rough : list of Attempt
        Solved, but the error bar exceeds the accuracy.
    """

    cases: Sequence[tuple[Mixture, State]]
    fluids: list[Fluid]
    lengths: list[float]
    closure: Closure
    accuracy: float
    results: list[Solution | None]
    too_rough: list[Attempt] = field(default_factory=list)
    stepper: Anderson = field(default_factory=Anderson)

    def __post_init__(self) -> None:
        tolerance = residual_tolerance(self.accuracy)
        self.rule = StoppingRule(tolerance, QUICK_STEPS)
        self.rough = StoppingRule(COARSE_TOLERANCE_FACTOR * tolerance, QUICK_STEPS)
        self.loose = StoppingRule(max(LOOSE, tolerance), QUICK_STEPS)

    def level(self, number: int, grid: Grid, x: Array, reference: Array) -> LevelResult:
        """One grid's result of a state; x and reference of shape (size,)."""
        return LevelResult(self.fluids[number], grid, self.closure, x[None].copy(), reference[None])

    def settle(self, attempt: Attempt) -> None:
        """Make a solution of it, or set it aside for a finer grid."""
        roughness = ERROR_SHARE * attempt.roughness
        floor = RESIDUAL_GAIN * self.rule.tolerance + attempt.tail
        relative_error = COUNT_SHARE * roughness + floor
        if relative_error > self.accuracy:
            self.too_rough.append(attempt)
            return
        mixture, state = self.cases[attempt.number]
        grid = attempt.fine.grid
        self.results[attempt.number] = Solution(
            mixture=mixture,
            state=state,
            closure=self.closure,
            accuracy=self.accuracy,
            status=Status.SOLVED,
            message=Status.SOLVED.sentence,
            branch_end_temperature=None,
            length=self.lengths[attempt.number],
            observables=attempt.sharp,
            errors=attempt.sharp.bars(roughness, floor),
            fine=attempt.fine,
            coarse=attempt.coarse,
            relative_error=relative_error,
            residuals=(attempt.residual,),
            stats=Stats(
                attempt.steps, 2 * attempt.steps, grid.points, grid.spacing, grid.extent, (), 0, attempt.seconds
            ),
        )


def stack(fluids: Sequence[Fluid]) -> Fluid:
    """One batch of many batches of one."""
    return Fluid(
        np.concatenate([f.rho for f in fluids]),
        np.concatenate([f.core for f in fluids]),
        np.concatenate([f.edge for f in fluids]),
        np.concatenate([f.attraction for f in fluids]),
    )


def refined(grid: Grid) -> Grid:
    """The fine grid that goes with a coarse one."""
    return Grid(grid.spacing / REFINEMENT, grid.points * REFINEMENT)


def on_branch(equations: Equations, x: Array) -> Flags:
    """Whether each state of a batch is stable and on the branch that starts at hard spheres."""
    stable = eigenvalues_above(equations.direct_from_zero(x), equations.root_rho, NEAR_INSTABILITY)
    for row in np.flatnonzero(~stable):
        stable[row] = on_first_branch(equations.take(np.array([row])), x[row : row + 1])
    return stable


def refine(job: Job) -> None:
    """Solve what was too rough again, each from the grid before: farther where the tail is what is
    missing, finer elsewhere."""
    for _ in range(MAX_REFINEMENTS - 1):
        groups: dict[tuple[float, int, float, int, int], list[Attempt]] = {}
        for attempt in job.too_rough:
            old = attempt.fine.grid
            new = wider(old) if attempt.tail > TAIL_SHARE * job.accuracy else refined(old)
            if new.points <= MAX_POINTS:
                key = (old.spacing, old.points, new.spacing, new.points, attempt.fine.fluid.rho.shape[1])
                groups.setdefault(key, []).append(attempt)
        job.too_rough = []
        for (_, _, spacing, points, _), attempts in groups.items():
            for start in range(0, len(attempts), BATCH):
                _refine_batch(job, attempts[start : start + BATCH], Grid(spacing, points))


def wider(grid: Grid) -> Grid:
    """Twice the extent."""
    return Grid(grid.spacing, 2 * grid.points)


def _refine_batch(job: Job, attempts: list[Attempt], new: Grid) -> None:
    began = time.perf_counter()
    old = attempts[0].fine.grid
    finer = new.spacing < old.spacing
    fluid = stack([attempt.fine.fluid for attempt in attempts])
    pairs = fluid.core.shape[1]
    same = np.concatenate((fluid.rho, fluid.core), axis=1)  # states with one hard-sphere reference
    _, chosen, member = np.unique(same, axis=0, return_index=True, return_inverse=True)
    references = regrid(np.concatenate([attempts[n].fine.reference for n in chosen]), pairs, old, new)
    good = np.ones(len(chosen), bool)
    bridge = None
    if job.closure.needs_reference:
        hard = Equations(stack([attempts[n].fine.fluid for n in chosen]).scaled(attraction=0.0), new, PY)
        solved = iterate_many(hard, references, job.rule, job.stepper)
        references, good = solved.x, solved.good
        with np.errstate(all="ignore"):
            bridge = bridge_function(references, hard)[member]
    references, good = references[member], good[member]
    equations = Equations(fluid, new, job.closure, bridge)
    start = regrid(np.concatenate([a.fine.x for a in attempts]), pairs, old, new)
    found = iterate_many(equations, start, job.rule, job.stepper)
    kept = np.flatnonzero(good & found.good)
    if len(kept) == 0:
        return
    part = equations.take(kept)
    x = found.x[kept]
    branch, sharp, tails = on_branch(part, x), observe_many(part, x), tail(part, x)
    seconds = (time.perf_counter() - began) / len(attempts)
    for row, place in enumerate(kept):
        before = attempts[place]
        if branch[row]:
            fine = job.level(before.number, new, x[row], references[place])
            steps = before.steps + int(found.steps[place])
            found_sharp = sharp.row(row)
            job.settle(
                replace(
                    before, coarse=before.fine if finer else before.coarse, fine=fine,
                    sharp=found_sharp,
                    roughness=float(found_sharp.roughness(before.sharp)) if finer else before.roughness,
                    tail=float(tails[row]), steps=steps, residual=float(found.residuals[place]),
                    seconds=before.seconds + seconds,
                )
            )  # fmt: skip
