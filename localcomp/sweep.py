"""A study solved: work units of neighbouring states, on any executor, into the store.

The units are fixed by the study alone, and a unit is stored in one transaction: a sweep that was
killed and resumed does the same arithmetic as one that was not.
"""

from __future__ import annotations

import itertools
import math
import time
from collections.abc import Callable, Iterator
from concurrent.futures import FIRST_COMPLETED, CancelledError, Executor, Future, wait
from dataclasses import dataclass
from typing import Any

import numpy as np

from localcomp.errors import LocalcompError, NoAnswer
from localcomp.executors import worker_deaths
from localcomp.neighbors import count_neighbors
from localcomp.report import clean
from localcomp.shells import ShellRule
from localcomp.store import Row, Store, StoreError, row_of
from localcomp.study import Case, Study
from ozsolve import Mixture, Solution, State, solve_many

UNIT_SIZE = 64
"""States in a work unit, families kept whole where they fit: about a tenth of a second of work. Larger
ones are no faster and leave workers idle at the end."""
AHEAD = 3
"""Units in flight per worker: enough to keep all busy, few enough to lose little."""

Progress = Callable[[int, int, int], None]


class WorkerLost(LocalcompError):
    """A worker process died; the message says what is safe."""


@dataclass(frozen=True)
class Unit:
    """States solved together in one task."""

    closure: str
    accuracy: float
    rule: ShellRule
    keys: tuple[str, ...]
    cases: tuple[tuple[Mixture, State], ...]


@dataclass(frozen=True)
class SweepResult:
    """What a sweep did.

    Attributes
    ----------
    total, solved, failed : int
        States of the study, with a physical solution, without.
    computed : int
        Solved or failed in this run; the rest was there already.
    seconds : float
    """

    total: int
    solved: int
    failed: int
    computed: int
    seconds: float


def units(study: Study) -> list[tuple[list[str], list[Case]]]:
    """Keys and cases of every work unit, fixed by the study alone."""
    keyed = list(zip(study.keys(), study.cases, strict=True))
    families = [_family(case) for case in study.cases]
    order = sorted(range(len(keyed)), key=lambda n: (families[n], n))
    out: list[tuple[list[str], list[Case]]] = []
    for _, numbers in itertools.groupby(order, key=lambda n: families[n]):
        members = list(numbers)
        for start in range(0, len(members), UNIT_SIZE):
            part = members[start : start + UNIT_SIZE]
            same = out and out[-1][1][-1].closure == keyed[part[0]][1].closure
            if not same or len(out[-1][0]) + len(part) > UNIT_SIZE:
                out.append(([], []))
            out[-1][0].extend(keyed[n][0] for n in part)
            out[-1][1].extend(keyed[n][1] for n in part)
    return out


def _family(case: Case) -> tuple[str, tuple[float, ...], tuple[float, ...]]:
    """What states share that profit from one another: closure, diameters, densities."""
    pairs = case.mixture.pairs
    return case.closure, (*np.ravel(pairs.diameter), *np.ravel(pairs.well_edge)), tuple(case.densities)


def work(unit: Unit) -> list[Row]:
    """Solve a unit: what a worker runs."""
    solutions = solve_many(unit.cases, closure=unit.closure, accuracy=unit.accuracy)
    return [row_of(key, result_of(solution, unit.rule)) for key, solution in zip(unit.keys, solutions, strict=True)]


def result_of(solution: Solution, rule: ShellRule) -> dict[str, Any]:
    """One state as stored: plain numbers, lists and words; lengths and energies in the study's units."""
    body: dict[str, Any] = {
        "status": solution.status.value,
        "message": solution.message,
        "branch_end_temperature": solution.branch_end_temperature,
    }
    if not solution.status.usable:
        return body
    try:
        found = count_neighbors(solution, rule)
    except NoAnswer as reason:
        return {**body, "status": "no_shell", "message": str(reason)}
    inside, outside = solution.edge_values
    body.update(
        shell_radius=found.radius,
        coordination_numbers=found.coordination_numbers,
        coordination_errors=found.coordination_errors,
        local_mole_fractions=found.local_mole_fractions,
        neighbor_ratios=found.neighbor_ratios,
        ratio_errors=found.ratio_errors,
        well_integrals=solution.observables.shell_integral * solution.length**3,
        contact_values=solution.contact_values,
        edge_inside=inside,
        edge_outside=outside,
        internal_energy=solution.internal_energy,
        virial_z=solution.virial_z,
        inverse_compressibility=solution.inverse_compressibility,
        kirkwood_buff=solution.kirkwood_buff,
        concentration_structure_factor=solution.concentration_structure_factor,
        relative_error=solution.relative_error,
    )
    return {name: _plain(value) for name, value in body.items()}


def _plain(value: Any) -> Any:
    """What JSON can hold: lists, and None for numbers that are not finite."""
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    if isinstance(value, np.ndarray):
        listed = value.tolist()
        return listed if math.isfinite(sum(map(sum, listed))) else clean(listed)
    return value


def run(study: Study, store: Store, executor: Executor, workers: int, progress: Progress | None = None) -> SweepResult:
    """Solve what the store does not have yet.

    Parameters
    ----------
    executor : concurrent.futures.Executor
    workers : int
        How many tasks it runs at a time.
    progress : callable, optional
        Called with (states present, states in all, failed so far in this run) after every unit.

    Raises
    ------
    StoreError
        If results cannot be written; what was stored is safe.
    """
    began = time.monotonic()
    store.note("study", study.text)
    known = store.known()
    all_units = units(study)
    total = len(study.cases)
    present = sum(key in known for keys, _ in all_units for key in keys)
    pending = _pending(study, all_units, known)
    flying: set[Future[Any]] = set()
    failed = computed = 0
    try:
        while True:
            for unit in itertools.islice(pending, max(0, AHEAD * workers - len(flying))):
                flying.add(executor.submit(work, unit))
            if not flying:
                break
            done, flying = wait(flying, return_when=FIRST_COMPLETED)
            for future in done:
                rows = future.result()
                store.add(rows)
                computed += len(rows)
                present += len(rows)
                failed += sum(status not in SOLVED for _, status, _ in rows)
                if progress is not None:
                    progress(present, total, failed)
    except CancelledError:  # a client cancels what it gave to a scheduler that is gone
        raise WorkerLost("the scheduler is gone; what was stored is safe, the same command resumes") from None
    except worker_deaths() as error:
        raise WorkerLost(
            f"a worker process died ({error}); what was stored is safe, the same command resumes"
        ) from None
    finally:
        for future in flying:
            future.cancel()
    status = store.known()
    solved = sum(status.get(key) in SOLVED for keys, _ in all_units for key in keys)
    return SweepResult(total, solved, total - solved, computed, time.monotonic() - began)


NUMBERS = frozenset(
    {
        "shell_radius", "coordination_numbers", "coordination_errors", "local_mole_fractions", "neighbor_ratios",
        "ratio_errors", "well_integrals", "contact_values", "internal_energy", "virial_z", "inverse_compressibility",
        "relative_error",
    }
)  # fmt: skip
"""What a solved state has."""
SOLVED = ("solved", "accuracy_not_reached")
"""Statuses of stored states that have numbers."""


def is_solved(result: dict[str, Any]) -> bool:
    """Whether a stored result has numbers.

    Raises
    ------
    StoreError
        If it says so but has not.
    """
    if result["status"] not in SOLVED:
        return False
    if not result.keys() >= NUMBERS:
        raise StoreError(f"the store is damaged: a solved state lacks {min(NUMBERS - result.keys())}")
    return True


def _pending(study: Study, all_units: list[tuple[list[str], list[Case]]], known: dict[str, str]) -> Iterator[Unit]:
    for keys, cases in all_units:
        missing = [n for n, key in enumerate(keys) if key not in known]
        if missing:
            yield Unit(
                cases[0].closure,
                study.accuracy,
                study.rule,
                tuple(keys[n] for n in missing),
                tuple((cases[n].mixture, cases[n].state) for n in missing),
            )
