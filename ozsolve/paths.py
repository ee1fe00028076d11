"""`solve_paths`: states along beta from hard spheres, many paths side by side.

A path keeps diameters, densities and the proportions of the well depths; only beta grows. All paths go
through their points together: every start is extrapolated in beta through the points before it, the
hard-sphere fluid (beta = 0) first, on the coarse grid and, for the difference between the grids, on the
fine one; and every accelerator begins with the secant pairs of the point before.

States are accepted by the rules of `solve_many`; every other state is handed to `solve`.
"""

from __future__ import annotations

import time
from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from itertools import pairwise

import numpy as np

from ozsolve.anderson import Anderson
from ozsolve.closures import HNC, RHNC, Closure, get_closure
from ozsolve.equations import Equations, regrid
from ozsolve.errors import InputError
from ozsolve.grid import Grid
from ozsolve.iteration import iterate_many
from ozsolve.job import BATCH, Attempt, Job, on_branch, refine, refined, stack
from ozsolve.many import SharedReference, group_by_grid, shared_references
from ozsolve.mixture import Mixture, State
from ozsolve.potential import Array
from ozsolve.solution import Solution, reduced_fluid
from ozsolve.solver import DEFAULT_ACCURACY, checked_accuracy, solve, tail
from ozsolve.stopping import StoppingRule
from ozsolve.thermodynamics import observe_many

DEPTH = 8
"""Secant pairs kept from point to point."""

STEPPER = Anderson(DEPTH)


@dataclass
class _Path:
    """One path and what was solved on it so far."""

    number: int
    family: SharedReference
    fractions: list[float] = field(default_factory=list)
    coarse: list[Array] = field(default_factory=list)
    corrections: list[Array] = field(default_factory=list)
    secants: tuple[Array, Array] | None = None
    secants_fine: tuple[Array, Array] | None = None
    lost: bool = False

    def guess(self, fraction: float) -> tuple[Array, Array]:
        """Coarse start and correction of the fine one, by polynomials through all points so far."""
        known = np.array(self.fractions)
        weights = np.array(
            [np.prod((fraction - np.delete(known, n)) / (known[n] - np.delete(known, n))) for n in range(len(known))]
        )
        return weights @ np.array(self.coarse), weights @ np.array(self.corrections)


def solve_paths(
    ends: Sequence[tuple[Mixture, State]],
    fractions: Sequence[float],
    *,
    closure: str | Closure = RHNC,
    accuracy: float = DEFAULT_ACCURACY,
) -> list[list[Solution]]:
    """Solve states at given fractions of beta on the way to each end state.

    Parameters
    ----------
    ends : sequence of (Mixture, State)
    fractions : sequence of float
        Of the end's beta, rising, in (0, 1].
    closure, accuracy :
        As for `solve`.

    Returns
    -------
    list of list of Solution
        Per end, at every fraction. States without a physical solution come back failed.

    Raises
    ------
    InputError
        If an argument is not acceptable.

    Examples
    --------
    >>> m = Mixture([1.0, 1.2], [1.0, 1.0])
    >>> ((half, whole),) = solve_paths([(m, State(1.5, (0.5, 0.5), packing_fraction=0.4))], [0.5, 1.0])
    >>> half.state.temperature, whole.state.temperature
    (3.0, 1.5)
    """
    chosen, accuracy = get_closure(closure), checked_accuracy(accuracy)
    steps = [float(f) for f in fractions]
    if not steps or steps[0] <= 0.0 or steps[-1] > 1.0 or any(a >= b for a, b in pairwise(steps)):
        raise InputError("fractions", list(fractions), "rising numbers in (0, 1]")
    cases = [(mixture, replace(state, temperature=state.temperature / f)) for mixture, state in ends for f in steps]
    reduced = [reduced_fluid(mixture, state) for mixture, state in cases]
    job = Job(cases, [f for f, _ in reduced], [length for _, length in reduced], chosen, accuracy, [None] * len(cases))
    for grid, families in group_by_grid(job):
        shared_references(job, grid, families)
        paths = [path for path in _paths(families, len(steps)) if path.family.reference_fine is not None]
        for path in paths:
            _begin(job, path, grid)
        for n, fraction in enumerate(steps):
            open_paths = [path for path in paths if not path.lost]
            for start in range(0, len(open_paths), BATCH):
                _advance(job, grid, open_paths[start : start + BATCH], n, fraction, len(steps))
    refine(job)
    solved = [
        found if found is not None else solve(*case, closure=chosen, accuracy=accuracy, on_failure="return")
        for found, case in zip(job.results, cases, strict=True)
    ]
    return [solved[n * len(steps) : (n + 1) * len(steps)] for n in range(len(ends))]


def _paths(families: list[SharedReference], steps: int) -> list[_Path]:
    """The paths on one grid; a path's states share densities, so that they are in one family."""
    found: dict[int, _Path] = {}
    for family in families:
        for member in family.members:
            found.setdefault(member // steps, _Path(member // steps, family))
    return list(found.values())


def _begin(job: Job, path: _Path, grid: Grid) -> None:
    """The hard-sphere fluid: where every path starts."""
    reference, fine = path.family.reference, path.family.reference_fine
    assert reference is not None
    assert fine is not None
    pairs = job.fluids[path.family.members[0]].core.shape[1]
    lifted = regrid(reference[None], pairs, grid, refined(grid))[0]
    path.fractions, path.coarse, path.corrections = [0.0], [reference], [fine - lifted]


def _advance(job: Job, grid: Grid, paths: list[_Path], n: int, fraction: float, steps: int) -> None:
    """One point of all these paths."""
    began = time.perf_counter()
    numbers = [path.number * steps + n for path in paths]
    fluid = stack([job.fluids[number] for number in numbers])
    pairs, finer = fluid.core.shape[1], refined(grid)
    needs = job.closure.needs_reference
    coarse = Equations(fluid, grid, job.closure, np.array([p.family.bridge for p in paths]) if needs else None)
    fine = Equations(fluid, finer, job.closure, np.array([p.family.bridge_fine for p in paths]) if needs else None)
    guesses = [path.guess(fraction) for path in paths]
    starts = np.array([guess for guess, _ in guesses])
    corrections = np.array([correction for _, correction in guesses])
    first = iterate_many(coarse, starts, job.rough, STEPPER, capture=True, memory=[p.secants for p in paths])
    lifted = regrid(first.x, pairs, grid, finer)
    rows = np.flatnonzero(first.good)
    for path, good in zip(paths, first.good, strict=True):
        path.lost = not good
    if len(rows) == 0:
        return
    part = fine if len(rows) == len(paths) else fine.take(rows)
    ending = StoppingRule(job.rule.tolerance, job.rule.max_steps)
    second = iterate_many(part, lifted[rows] + corrections[rows], ending, STEPPER, capture=True,
                          memory=[paths[row].secants_fine for row in rows])  # fmt: skip
    branch = on_branch(part, second.x)
    sharp = observe_many(part, second.x)
    rough = observe_many(coarse if len(rows) == len(paths) else coarse.take(rows), first.x[rows])
    tails, roughness = tail(part, second.x), sharp.roughness(rough)
    seconds = (time.perf_counter() - began) / len(paths)
    for k, row in enumerate(rows.tolist()):
        path = paths[row]
        if not (second.good[k] and branch[k]):
            path.lost = True
            continue
        path.secants = first.secants[row] or path.secants
        path.secants_fine = second.secants[k] or path.secants_fine
        correction = second.x[k] - lifted[row]
        if n == 0 and job.closure is HNC:  # the hard-sphere limit of this closure is not the reference
            path.fractions, path.coarse, path.corrections = [], [], []
        path.fractions.append(fraction)
        path.coarse.append(first.x[row])
        path.corrections.append(correction)
        assert path.family.reference is not None
        assert path.family.reference_fine is not None
        job.settle(
            Attempt(
                numbers[row],
                job.level(numbers[row], grid, first.x[row], path.family.reference),
                job.level(numbers[row], finer, second.x[k], path.family.reference_fine),
                sharp.row(k),
                float(roughness[k]),
                float(tails[k]),
                int(first.steps[row] + second.steps[k]),
                float(second.residuals[k]),
                seconds,
            )
        )
