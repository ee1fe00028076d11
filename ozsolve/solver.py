"""`solve`: pick grids for the accuracy asked, find the physical root, put error bars on it.

Two grids are solved. On the coarse one the root is found from scratch; on the fine one (spacing cut
by `REFINEMENT`) a few more iterations finish it. A share of the difference is the error bar. If the
bar exceeds the accuracy asked, the fine grid becomes the coarse one of the next pair. The extent
doubles while correlations at its end still matter.
"""

from __future__ import annotations

import time
from dataclasses import dataclass

import numpy as np

from ozsolve.anderson import Anderson
from ozsolve.closures import RHNC, Closure, get_closure
from ozsolve.equations import Equations, Fluid, regrid
from ozsolve.errors import InputError, NotConverged
from ozsolve.grid import Grid, good_size
from ozsolve.mixture import Mixture, State
from ozsolve.oz import lowest_eigenvalue
from ozsolve.potential import Array
from ozsolve.root import Counters, Root, find_root
from ozsolve.solution import LevelResult, Solution, Stats, reduced_fluid
from ozsolve.stopping import Status, StoppingRule
from ozsolve.thermodynamics import COUNT_SHARE, ERROR_SHARE, Observables, observe

FINEST_ACCURACY, COARSEST_ACCURACY = 1e-10, 1e-2
DEFAULT_ACCURACY = 1e-5
REFERENCE_SPACING = 0.03
"""Fine spacing (smallest diameters) that serves the default accuracy; by trial on 200 liquids."""
ORDER = 5.0
"""Observed order of the error in the spacing; sets how the spacing follows the accuracy."""
SPACING_LIMITS = (0.0025, 0.0625)
REFINEMENT = 2
EXTENT = 10.0
"""First extent, in the largest diameter, beyond the longest well."""
TAIL_SHARE = 0.1
"""Share of the accuracy that cutting correlations may cost before the extent doubles."""
NO_TAIL = 1e-14
"""Below this no response short of a divergence makes the tail count."""
MAX_POINTS = 1 << 15
MAX_REFINEMENTS = 4
RESIDUAL_SHARE = 1e-3
"""Tolerance of the residual as a share of the accuracy asked."""
SMALLEST_TOLERANCE = 2e-12
COARSE_TOLERANCE_FACTOR = 10.0
"""The coarse grid only feeds the error bar and the fine grid's start."""
RESIDUAL_GAIN = 30.0
"""How much a residual may be amplified on its way to a coordination number."""


def solve(
    mixture: Mixture,
    state: State,
    *,
    closure: str | Closure = RHNC,
    accuracy: float = DEFAULT_ACCURACY,
    on_failure: str = "raise",
) -> Solution:
    """Solve the Ornstein-Zernike equation of a square-well mixture.

    Parameters
    ----------
    mixture : Mixture
    state : State
    closure : str or Closure, default RHNC
        "msa", "py", "hnc", "rhnc".
    accuracy : float, default 1e-5
        Relative accuracy asked of the coordination numbers, between 1e-10 and 1e-2.
    on_failure : {"raise", "return"}
        Whether a state without a physical solution raises or comes back as a failed `Solution`.

    Returns
    -------
    Solution
        Lengths and energies in the mixture's units.

    Raises
    ------
    InputError
        If an argument is not acceptable.
    NotConverged
        If no physical solution was found; it carries the failed `Solution`.

    Examples
    --------
    >>> hard = Mixture(1.0, 0.0)
    >>> s = solve(hard, State(1.0, packing_fraction=0.3), closure="py")
    >>> round(float(s.contact_values[0, 0]), 4)  # (1 + eta/2)/(1 - eta)^2
    2.3469
    """
    chosen = get_closure(closure)
    if on_failure not in ("raise", "return"):
        raise InputError("on_failure", on_failure, "one of: raise, return")
    accuracy = checked_accuracy(accuracy)
    began = time.perf_counter()
    fluid, length = reduced_fluid(mixture, state)
    ladder = _climb(fluid, chosen, accuracy)
    solution = _assemble(mixture, state, chosen, accuracy, length, ladder, began)
    if on_failure == "raise" and not solution.status.usable:
        raise NotConverged(solution)
    return solution


def residual_tolerance(accuracy: float) -> float:
    """Residual at which a solve stops, for the accuracy asked."""
    return max(RESIDUAL_SHARE * accuracy, SMALLEST_TOLERANCE)


def checked_accuracy(accuracy: float) -> float:
    """The accuracy as a number within the limits, or an `InputError`."""
    try:
        value = float(accuracy)
    except (TypeError, ValueError):
        value = float("nan")
    if not FINEST_ACCURACY <= value <= COARSEST_ACCURACY:
        raise InputError("accuracy", accuracy, f"a number between {FINEST_ACCURACY:g} and {COARSEST_ACCURACY:g}")
    return value


@dataclass
class _Ladder:
    """The pair of grids in hand."""

    status: Status
    fine: Root
    coarse: Root | None
    observables: Observables
    errors: Observables
    relative_error: float
    counters: Counters


def first_grid(fluid: Fluid, accuracy: float) -> Grid:
    """The coarse grid to begin with, for the accuracy asked."""
    wanted = REFERENCE_SPACING * (accuracy / DEFAULT_ACCURACY) ** (1.0 / ORDER)
    spacing = REFINEMENT * float(np.clip(wanted, *SPACING_LIMITS))
    extent = EXTENT * float(fluid.core.max()) + float(fluid.edge.max())
    return Grid(spacing, good_size(int(np.ceil(extent / spacing))))


def _climb(fluid: Fluid, closure: Closure, accuracy: float) -> _Ladder:
    stepper = Anderson()
    tolerance = residual_tolerance(accuracy)
    rule = StoppingRule(tolerance)
    counters = Counters()
    species = fluid.rho.shape[1]
    grid = first_grid(fluid, accuracy)
    rough_rule = StoppingRule(COARSE_TOLERANCE_FACTOR * tolerance)
    coarse = find_root(fluid, grid, closure, rough_rule, stepper, counters)
    if coarse.status is not Status.SOLVED:
        # The equations on a coarse grid can have a branch end of their own, short of the real one (seen with
        # HNC in dense fluids): no state is called without solution before the fine spacing says so too.
        grid = Grid(grid.spacing / REFINEMENT, REFINEMENT * grid.points)
        coarse = find_root(fluid, grid, closure, rough_rule, stepper, counters)
    while (
        coarse.status is Status.SOLVED
        and _tail(coarse) > TAIL_SHARE * accuracy
        and 2 * grid.points <= MAX_POINTS // REFINEMENT
    ):
        wider = Grid(grid.spacing, 2 * grid.points)
        coarse = _move(coarse, grid, wider, fluid, closure, rough_rule, stepper, counters)
        grid = wider
    missing = Observables.missing(species)
    if coarse.status is not Status.SOLVED:
        return _Ladder(coarse.status, coarse, None, missing, missing, np.nan, counters)
    rough = observe(coarse.equations, coarse.x)
    for level in range(MAX_REFINEMENTS):
        finer = Grid(grid.spacing / REFINEMENT, grid.points * REFINEMENT)
        fine = _move(coarse, grid, finer, fluid, closure, rule, stepper, counters)
        if fine.status is not Status.SOLVED:
            return _Ladder(fine.status, fine, None, missing, missing, np.nan, counters)
        sharp = observe(fine.equations, fine.x)
        floor = RESIDUAL_GAIN * tolerance + _tail(fine)
        roughness = ERROR_SHARE * float(sharp.roughness(rough))
        relative_error = COUNT_SHARE * roughness + floor
        reached = relative_error <= accuracy
        last = level == MAX_REFINEMENTS - 1 or finer.points * REFINEMENT > MAX_POINTS
        if reached or last:
            status = Status.SOLVED if reached else Status.ACCURACY_NOT_REACHED
            return _Ladder(status, fine, coarse, sharp, sharp.bars(roughness, floor), relative_error, counters)
        coarse, grid, rough = fine, finer, sharp
    raise AssertionError("the loop above always returns")


def _tail(root: Root) -> float:
    return float(tail(root.equations, root.x)[0])


def tail(equations: Equations, x: Array) -> Array:
    """Relative effect of cutting correlations at the extent.

    The sine basis puts the mirror image of r h(r) behind the end. The image decays once more on its
    way back to the shell, so its effect is that of r h(r) at twice the extent, about the square of
    the largest |r h(r)| in the last tenth; close to instability the response to it grows as the
    inverse of the lowest eigenvalue of I - C(0). Factors by trial (extents of 6 against 25, liquids
    and near-critical fluids). Shape (b,) for x of shape (b, size).
    """
    tail_start = int(0.9 * equations.shape[2])
    rh = x.reshape(equations.shape)[:, :, tail_start:]
    image = np.asarray(np.abs(rh).max(axis=(1, 2)) ** 2)
    if image.max() < NO_TAIL:
        return image
    lowest = lowest_eigenvalue(equations.direct_zero(x)[:, :, None], equations.root_rho)
    return np.asarray(image * (0.25 + 5.0 / np.maximum(lowest, 1e-6)))


def _move(
    root: Root,
    old: Grid,
    new: Grid,
    fluid: Fluid,
    closure: Closure,
    rule: StoppingRule,
    stepper: Anderson,
    counters: Counters,
) -> Root:
    """The same state on another grid, started from `root`."""
    pairs = fluid.core.shape[1]
    start = regrid(root.x, pairs, old, new)
    reference = regrid(root.reference, pairs, old, new)
    return find_root(fluid, new, closure, rule, stepper, counters, start, reference)


def _assemble(
    mixture: Mixture, state: State, closure: Closure, accuracy: float, length: float, ladder: _Ladder, began: float
) -> Solution:
    fine = ladder.fine
    grid = fine.equations.grid
    end: float | None = None
    message = ladder.status.sentence
    if not ladder.status.usable:
        if fine.reached > 0.0:
            end = state.temperature / fine.reached
            message += (
                f" The {closure.title} closure was followed from hard spheres down to kT = {end:.5g}; "
                f"kT = {state.temperature:.5g} was asked for."
            )
        else:
            message += f" The {closure.title} closure has no solution for the hard-sphere mixture at this density."
    stats = Stats(
        steps=ladder.counters.steps,
        transforms=2 * ladder.counters.steps,
        grid_points=grid.points,
        spacing=grid.spacing,
        extent=grid.extent,
        rungs=tuple(ladder.counters.rungs),
        restarts=ladder.counters.restarts,
        seconds=time.perf_counter() - began,
    )
    coarse = ladder.coarse
    return Solution(
        mixture=mixture,
        state=state,
        closure=closure,
        accuracy=accuracy,
        status=ladder.status,
        message=message,
        branch_end_temperature=end,
        length=length,
        observables=ladder.observables,
        errors=ladder.errors,
        fine=LevelResult.of(fine.equations, fine.x, fine.reference),
        coarse=None if coarse is None else LevelResult.of(coarse.equations, coarse.x, coarse.reference),
        relative_error=ladder.relative_error,
        residuals=tuple(fine.residuals),
        stats=stats,
    )
