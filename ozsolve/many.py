"""`solve_many`: arrays of states solved together.

States that share diameters and densities share their hard-sphere reference and form a family; inside
a family only the reduced depths B = beta eps differ, and gamma is a smooth function of them. Each
family is solved in waves: a few spread-out seeds from the mean spherical start, then the others from
an interpolation in B through the family's solved members (`interpolation`), on the coarse grid and,
for the difference between the grids, on the fine one. All families go through a wave together, in
batches small enough to stay in cache.

A state is accepted by the rules of `solve`: converged, I - C(k) positive definite at every k and far
enough from instability, error bar within the accuracy. Every other state is handed to `solve`.
"""

from __future__ import annotations

import time
from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np

from ozsolve.anderson import Anderson, Recycled
from ozsolve.closures import MSA, PY, RHNC, Closure, get_closure
from ozsolve.equations import Equations, Fluid, regrid
from ozsolve.grid import Grid
from ozsolve.interpolation import Scatter, spread_order
from ozsolve.iteration import BatchOutcome, iterate_many
from ozsolve.job import BATCH, BRIEF_STEPS, Attempt, Job, on_branch, refine, refined, stack
from ozsolve.mixture import Mixture, State
from ozsolve.potential import Array, Indices
from ozsolve.root import bridge_function
from ozsolve.solution import Solution, reduced_fluid
from ozsolve.solver import DEFAULT_ACCURACY, checked_accuracy, first_grid, solve, tail
from ozsolve.stopping import StoppingRule
from ozsolve.thermodynamics import observe_many

SEEDS = 5
"""Members of a family solved first, to interpolate from and to take secant pairs from."""
SEED_DEPTH = 16
"""Secant pairs a seed remembers: enough to span the slow directions."""


@dataclass
class SharedReference:
    """States with one hard-sphere reference on one pair of grids."""

    members: list[int]
    depths: Array
    reference: Array | None = None
    reference_fine: Array | None = None
    bridge: Array | None = None
    bridge_fine: Array | None = None
    recycled: Recycled | None = None
    recycled_fine: Recycled | None = None
    coarse: Scatter = field(default_factory=Scatter)
    correction: Scatter = field(default_factory=Scatter)
    order: list[int] = field(default_factory=list)


def solve_many(
    cases: Sequence[tuple[Mixture, State]],
    *,
    closure: str | Closure = RHNC,
    accuracy: float = DEFAULT_ACCURACY,
) -> list[Solution]:
    """Solve many states together; answers agree with `solve` within both error bars.

    Parameters
    ----------
    cases : sequence of (Mixture, State)
        In any order; states that share diameters and densities profit from one another.
    closure, accuracy :
        As for `solve`.

    Returns
    -------
    list of Solution
        In the order of the cases. A state without a physical solution comes back failed, with its
        status; nothing is raised for it.

    Raises
    ------
    InputError
        If an argument is not acceptable.

    Examples
    --------
    >>> m = Mixture([1.0, 1.2], [1.0, 1.0])
    >>> found = solve_many([(m, State(t, (0.5, 0.5), packing_fraction=0.4)) for t in (1.5, 2.0, 3.0)])
    >>> [s.status.value for s in found]
    ['solved', 'solved', 'solved']
    """
    chosen, accuracy = get_closure(closure), checked_accuracy(accuracy)
    reduced = [reduced_fluid(mixture, state) for mixture, state in cases]
    job = Job(
        cases, [fluid for fluid, _ in reduced], [length for _, length in reduced], chosen, accuracy, [None] * len(cases)
    )
    for grid, families in group_by_grid(job):
        shared_references(job, grid, families)
        ready = [family for family in families if family.reference_fine is not None]
        missed: list[tuple[SharedReference, int]] = []
        for batch in _batches(ready):
            missed += _solve_batch(job, grid, batch)
        for batch in _second_attempts(missed):
            _solve_batch(job, grid, batch)
    refine(job)
    return [
        found if found is not None else solve(*case, closure=chosen, accuracy=accuracy, on_failure="return")
        for found, case in zip(job.results, cases, strict=True)
    ]


def group_by_grid(job: Job) -> list[tuple[Grid, list[SharedReference]]]:
    """Families by grid."""
    grids: dict[tuple[float, int, int], Grid] = {}
    found: dict[tuple[float, int, int], dict[bytes, list[int]]] = {}
    for n, fluid in enumerate(job.fluids):
        grid = first_grid(fluid, job.accuracy)
        key = (grid.spacing, grid.points, fluid.rho.shape[1])
        grids.setdefault(key, grid)
        family = np.concatenate((fluid.rho, fluid.core, fluid.edge), axis=1).tobytes()
        found.setdefault(key, {}).setdefault(family, []).append(n)
    out = []
    for key, by_family in found.items():
        families = []
        for members in by_family.values():
            depths = np.concatenate([job.fluids[n].attraction for n in members])
            families.append(SharedReference(members, depths, order=spread_order(depths)))
        out.append((grids[key], families))
    return out


def shared_references(job: Job, grid: Grid, families: list[SharedReference]) -> None:
    """Percus-Yevick hard spheres of every family, on both grids when the closure needs them."""
    for start in range(0, len(families), BATCH):
        chunk = families[start : start + BATCH]
        hard = stack([job.fluids[family.members[0]] for family in chunk]).scaled(attraction=0.0)
        coarse = Equations(hard, grid, PY)
        pairs, points = coarse.shape[1], grid.points
        needed = job.closure.needs_reference
        first = iterate_many(coarse, np.zeros((len(chunk), pairs * (points - 1))), job.rough if needed else job.loose,
                             job.stepper)  # fmt: skip
        finer = refined(grid)
        lifted = regrid(first.x, pairs, grid, finer)
        good = first.good
        bridges = bridges_fine = None
        if needed:
            fine = Equations(hard, finer, PY)
            second = iterate_many(fine, lifted, job.rule, job.stepper)
            lifted, good = second.x, good & second.good
            with np.errstate(all="ignore"):
                bridges, bridges_fine = bridge_function(first.x, coarse), bridge_function(second.x, fine)
        for n, family in enumerate(chunk):
            if good[n]:
                family.reference, family.reference_fine = first.x[n], lifted[n]
                if bridges is not None and bridges_fine is not None:
                    family.bridge, family.bridge_fine = bridges[n], bridges_fine[n]


def _batches(families: list[SharedReference]) -> list[list[tuple[SharedReference, int]]]:
    """(family, position in it): seeds of all families mixed, then the rest, a family at a time."""
    seeds = [(family, n) for family in families for n in family.order[:SEEDS]]
    batches = [seeds[start : start + BATCH] for start in range(0, len(seeds), BATCH)]
    for family in families:
        rest = family.order[SEEDS:]
        count = -(-len(rest) // BATCH)
        batches += [[(family, n) for n in rest[part::count]] for part in range(count)]
    return batches


def _second_attempts(missed: list[tuple[SharedReference, int]]) -> list[list[tuple[SharedReference, int]]]:
    """States that did not converge from their first start, where their family knows more by now."""
    again: dict[int, list[tuple[SharedReference, int]]] = {}
    for family, n in missed:
        if family.recycled is not None and family.coarse.known:
            again.setdefault(id(family), []).append((family, n))
    return list(again.values())


def _solve_batch(job: Job, grid: Grid, batch: list[tuple[SharedReference, int]]) -> list[tuple[SharedReference, int]]:
    """One batch on both grids; solved states go to the job and to their family's memory, the others
    come back."""
    began = time.perf_counter()
    family = batch[0][0]
    shared = family if all(f is family for f, _ in batch) and family.recycled is not None else None
    fluid = stack([job.fluids[f.members[n]] for f, n in batch])
    pairs = fluid.core.shape[1]
    needs = job.closure.needs_reference
    finer = refined(grid)
    coarse = Equations(fluid, grid, job.closure, np.array([f.bridge for f, _ in batch]) if needs else None)
    fine = Equations(fluid, finer, job.closure, np.array([f.bridge_fine for f, _ in batch]) if needs else None)
    start = _starts(job, coarse, batch)
    if shared is None:
        first = iterate_many(coarse, start, job.rough, Anderson(SEED_DEPTH), capture=True)
    else:
        brief = StoppingRule(job.rough.tolerance, BRIEF_STEPS)
        first = iterate_many(coarse, start, brief, job.stepper, shared.recycled)
    rows = np.flatnonzero(first.good)
    missed = [batch[row] for row in np.flatnonzero(~first.good)]
    if len(rows) == 0:
        return missed
    lifted = regrid(first.x, pairs, grid, finer)
    start = lifted.copy()
    for row, (f, n) in enumerate(batch):
        correction = f.correction.at(f.depths[n])
        if correction is not None:
            start[row] += correction
    part = fine if len(rows) == len(batch) else fine.take(rows)
    ending = StoppingRule(job.rule.tolerance, BRIEF_STEPS)
    second = iterate_many(part, start[rows], ending, job.stepper, None if shared is None else shared.recycled_fine)
    missed += [batch[rows[row]] for row in np.flatnonzero(~second.good)]
    _accept(job, batch, coarse, part, first, second, rows, lifted, began)
    if shared is None:
        _remember_secants(batch, first, grid, pairs)
    return missed


def _remember_secants(batch: list[tuple[SharedReference, int]], outcome: BatchOutcome, grid: Grid, pairs: int) -> None:
    """Give each family the secant pairs of its first solved seed, on both grids."""
    for row, (family, _) in enumerate(batch):
        found = outcome.secants[row]
        if found is None or family.recycled is not None or len(family.members) <= SEEDS:
            continue
        finer = refined(grid)
        family.recycled = Recycled(*found)
        family.recycled_fine = Recycled(*(regrid(rows, pairs, grid, finer) for rows in found))


def _starts(job: Job, coarse: Equations, batch: list[tuple[SharedReference, int]]) -> Array:
    """Interpolated in the family where it has members already, else the mean spherical solution."""
    references = np.array([family.reference for family, _ in batch])
    guesses = [family.coarse.at(family.depths[n]) for family, n in batch]
    starts = references.copy()
    blank = [row for row, guess in enumerate(guesses) if guess is None]
    for row, guess in enumerate(guesses):
        if guess is not None:
            starts[row] = guess
    if blank and job.closure is not MSA:
        rows = np.array(blank)
        fluid = coarse.fluid
        part = Fluid(fluid.rho[rows], fluid.core[rows], fluid.edge[rows], fluid.attraction[rows])
        spherical = iterate_many(Equations(part, coarse.grid, MSA), references[rows], job.loose, job.stepper)
        good = rows[spherical.good]
        starts[good] = spherical.x[spherical.good]
    return starts


def _accept(
    job: Job, batch: list[tuple[SharedReference, int]], coarse: Equations, fine: Equations, first: BatchOutcome,
    second: BatchOutcome, rows: Indices, lifted: Array, began: float,
) -> None:  # fmt: skip
    kept = np.flatnonzero(second.good)
    if len(kept) == 0:
        return
    sharp_equations = fine if len(kept) == len(rows) else fine.take(kept)
    chosen = rows[kept]
    rough_equations = coarse if len(chosen) == len(batch) else coarse.take(chosen)
    x = second.x[kept]
    branch = on_branch(sharp_equations, x)
    sharp, rough = observe_many(sharp_equations, x), observe_many(rough_equations, first.x[chosen])
    tails, roughness = tail(sharp_equations, x), sharp.roughness(rough)
    seconds = (time.perf_counter() - began) / len(batch)
    for row, place in enumerate(chosen):
        family, member = batch[place]
        if not branch[row]:
            continue
        family.coarse.add(family.depths[member], first.x[place])
        family.correction.add(family.depths[member], x[row] - lifted[place])
        number = family.members[member]
        assert family.reference is not None
        assert family.reference_fine is not None
        job.settle(
            Attempt(
                number,
                job.level(number, coarse.grid, first.x[place], family.reference),
                job.level(number, fine.grid, x[row], family.reference_fine),
                sharp.row(row),
                float(roughness[row]),
                float(tails[row]),
                int(first.steps[place] + second.steps[kept[row]]),
                float(second.residuals[kept[row]]),
                seconds,
            )
        )
