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
from ozsolve.mixture import Mixture, State
from ozsolve.oz import eigenvalues_above
from ozsolve.potential import Array, Indices
from ozsolve.root import LOOSE, NEAR_INSTABILITY, QUICK_STEPS, bridge_function, on_first_branch
from ozsolve.solution import LevelResult, Solution, Stats, reduced_fluid
from ozsolve.solver import (
    COARSE_TOLERANCE_FACTOR,
    DEFAULT_ACCURACY,
    REFINEMENT,
    RESIDUAL_GAIN,
    checked_accuracy,
    first_grid,
    residual_tolerance,
    solve,
    tail,
)
from ozsolve.stopping import Status, StoppingRule
from ozsolve.thermodynamics import COUNT_SHARE, ERROR_SHARE, Observables, observe_many

BATCH = 32
"""States in a batch: three pairs of 400 points and the accelerator's memory then fit the cache."""
GRID_SHARES = (1.0, 0.1, 0.01)
"""Shares of the accuracy that choose the grid, one pass after another for states whose bar is too wide."""
SEEDS = 5
"""Members of a family solved first, to interpolate from and to take secant pairs from."""
BRIEF_STEPS = 24
"""Steps from a good start; a state that needs more waits for a better one, so as not to hold up its batch."""
SEED_DEPTH = 16
"""Secant pairs a seed remembers: enough to span the slow directions."""


@dataclass
class _Family:
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


@dataclass
class _Job:
    """What all batches of one call share."""

    cases: Sequence[tuple[Mixture, State]]
    fluids: list[Fluid]
    lengths: list[float]
    closure: Closure
    accuracy: float
    results: list[Solution | None]
    too_rough: list[int] = field(default_factory=list)
    missed: list[tuple[_Family, int]] = field(default_factory=list)
    stepper: Anderson = field(default_factory=Anderson)

    def __post_init__(self) -> None:
        tolerance = residual_tolerance(self.accuracy)
        self.rule = StoppingRule(tolerance, QUICK_STEPS)
        self.rough = StoppingRule(COARSE_TOLERANCE_FACTOR * tolerance, QUICK_STEPS)
        self.loose = StoppingRule(max(LOOSE, tolerance), QUICK_STEPS)


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
    job = _Job(
        cases, [fluid for fluid, _ in reduced], [length for _, length in reduced], chosen, accuracy, [None] * len(cases)
    )
    remaining = list(range(len(cases)))
    for share in GRID_SHARES:
        job.too_rough = []
        for grid, families in _families(job, remaining, share * accuracy):
            _references(job, grid, families)
            ready = [family for family in families if family.reference_fine is not None]
            for batch in _batches(ready):
                _solve_batch(job, grid, batch)
            _second_attempt(job, grid)
        remaining = job.too_rough
    return [
        found if found is not None else solve(*case, closure=chosen, accuracy=accuracy, on_failure="return")
        for found, case in zip(job.results, cases, strict=True)
    ]


def _families(job: _Job, numbers: Sequence[int], accuracy: float) -> list[tuple[Grid, list[_Family]]]:
    """Families of the numbered states, by the grid for that accuracy."""
    grids: dict[tuple[float, int, int], Grid] = {}
    found: dict[tuple[float, int, int], dict[bytes, list[int]]] = {}
    for n in numbers:
        fluid = job.fluids[n]
        grid = first_grid(fluid, accuracy)
        key = (grid.spacing, grid.points, fluid.rho.shape[1])
        grids.setdefault(key, grid)
        family = np.concatenate((fluid.rho, fluid.core, fluid.edge), axis=1).tobytes()
        found.setdefault(key, {}).setdefault(family, []).append(n)
    out = []
    for key, by_family in found.items():
        families = []
        for members in by_family.values():
            depths = np.concatenate([job.fluids[n].attraction for n in members])
            families.append(_Family(members, depths, order=spread_order(depths)))
        out.append((grids[key], families))
    return out


def _stack(fluids: Sequence[Fluid]) -> Fluid:
    return Fluid(
        np.concatenate([f.rho for f in fluids]),
        np.concatenate([f.core for f in fluids]),
        np.concatenate([f.edge for f in fluids]),
        np.concatenate([f.attraction for f in fluids]),
    )


def _references(job: _Job, grid: Grid, families: list[_Family]) -> None:
    """Percus-Yevick hard spheres of every family, on both grids when the closure needs them."""
    for start in range(0, len(families), BATCH):
        chunk = families[start : start + BATCH]
        hard = _stack([job.fluids[family.members[0]] for family in chunk]).scaled(attraction=0.0)
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


def refined(grid: Grid) -> Grid:
    """The fine grid that goes with a coarse one."""
    return Grid(grid.spacing / REFINEMENT, grid.points * REFINEMENT)


def _batches(families: list[_Family]) -> list[list[tuple[_Family, int]]]:
    """(family, position in it): seeds of all families mixed, then the rest, a family at a time."""
    seeds = [(family, n) for family in families for n in family.order[:SEEDS]]
    batches = [seeds[start : start + BATCH] for start in range(0, len(seeds), BATCH)]
    for family in families:
        rest = family.order[SEEDS:]
        count = -(-len(rest) // BATCH)
        batches += [[(family, n) for n in rest[part::count]] for part in range(count)]
    return batches


def _second_attempt(job: _Job, grid: Grid) -> None:
    """States that did not converge from their first start, from what their family knows by now."""
    again: dict[int, list[tuple[_Family, int]]] = {}
    for family, n in job.missed:
        if family.recycled is not None and family.coarse.known:
            again.setdefault(id(family), []).append((family, n))
    job.missed = []
    for batch in again.values():
        _solve_batch(job, grid, batch)
    job.missed = []


def _solve_batch(job: _Job, grid: Grid, batch: list[tuple[_Family, int]]) -> None:
    """One batch on both grids; accepted states go to the results and to their family's memory."""
    began = time.perf_counter()
    family = batch[0][0]
    shared = family if all(f is family for f, _ in batch) and family.recycled is not None else None
    fluid = _stack([job.fluids[f.members[n]] for f, n in batch])
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
    job.missed += [batch[row] for row in np.flatnonzero(~first.good)]
    if len(rows) == 0:
        return
    lifted = regrid(first.x, pairs, grid, finer)
    start = lifted.copy()
    for row, (f, n) in enumerate(batch):
        correction = f.correction.at(f.depths[n])
        if correction is not None:
            start[row] += correction
    part = fine if len(rows) == len(batch) else fine.take(rows)
    ending = StoppingRule(job.rule.tolerance, BRIEF_STEPS)
    second = iterate_many(part, start[rows], ending, job.stepper, None if shared is None else shared.recycled_fine)
    job.missed += [batch[rows[row]] for row in np.flatnonzero(~second.good)]
    _accept(job, batch, coarse, part, first, second, rows, lifted, began)
    if shared is None:
        _remember_secants(batch, first, grid, pairs)


def _remember_secants(batch: list[tuple[_Family, int]], outcome: BatchOutcome, grid: Grid, pairs: int) -> None:
    """Give each family the secant pairs of its first solved seed, on both grids."""
    for row, (family, _) in enumerate(batch):
        found = outcome.secants[row]
        if found is None or family.recycled is not None or len(family.members) <= SEEDS:
            continue
        finer = refined(grid)
        family.recycled = Recycled(*found)
        family.recycled_fine = Recycled(*(regrid(rows, pairs, grid, finer) for rows in found))


def _starts(job: _Job, coarse: Equations, batch: list[tuple[_Family, int]]) -> Array:
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
    job: _Job, batch: list[tuple[_Family, int]], coarse: Equations, fine: Equations, first: BatchOutcome,
    second: BatchOutcome, rows: Indices, lifted: Array, began: float,
) -> None:  # fmt: skip
    kept = np.flatnonzero(second.good)
    if len(kept) == 0:
        return
    sharp_equations = fine if len(kept) == len(rows) else fine.take(kept)
    chosen = rows[kept]
    rough_equations = coarse if len(chosen) == len(batch) else coarse.take(chosen)
    x = second.x[kept]
    stable = eigenvalues_above(sharp_equations.direct_from_zero(x), sharp_equations.root_rho, NEAR_INSTABILITY)
    sharp, rough = observe_many(sharp_equations, x), observe_many(rough_equations, first.x[chosen])
    tails = tail(sharp_equations, x)
    floors = RESIDUAL_GAIN * job.rule.tolerance + tails
    roughness = ERROR_SHARE * sharp.roughness(rough)
    seconds = (time.perf_counter() - began) / len(batch)
    for row, place in enumerate(chosen):
        family, member = batch[place]
        if not stable[row] and not on_first_branch(sharp_equations.take(np.array([row])), x[row : row + 1]):
            continue
        family.coarse.add(family.depths[member], first.x[place])
        family.correction.add(family.depths[member], x[row] - lifted[place])
        if COUNT_SHARE * roughness[row] + floors[row] > job.accuracy:
            job.too_rough.append(family.members[member])
            continue
        steps = int(first.steps[place] + second.steps[kept[row]])
        number = family.members[member]
        job.results[number] = _solution(
            job, number, family, sharp_equations, x[row], coarse, first.x[place], sharp.row(row), float(roughness[row]),
            float(floors[row]), steps,
            float(second.residuals[kept[row]]), seconds,
        )  # fmt: skip


def _solution(
    job: _Job, number: int, family: _Family, fine: Equations, x: Array, coarse: Equations, x_coarse: Array,
    observables: Observables, roughness: float, floor: float, steps: int, residual: float, seconds: float,
) -> Solution:  # fmt: skip
    mixture, state = job.cases[number]
    fluid = job.fluids[number]
    assert family.reference is not None
    assert family.reference_fine is not None
    return Solution(
        mixture=mixture,
        state=state,
        closure=job.closure,
        accuracy=job.accuracy,
        status=Status.SOLVED,
        message=Status.SOLVED.sentence,
        branch_end_temperature=None,
        length=job.lengths[number],
        observables=observables,
        errors=observables.bars(roughness, floor),
        fine=LevelResult(fluid, fine.grid, job.closure, x[None].copy(), family.reference_fine[None]),
        coarse=LevelResult(fluid, coarse.grid, job.closure, x_coarse[None].copy(), family.reference[None]),
        relative_error=COUNT_SHARE * roughness + floor,
        residuals=(residual,),
        stats=Stats(steps, 2 * steps, fine.grid.points, fine.grid.spacing, fine.grid.extent, (), 0, seconds),
    )
