"""How long a sweep will take: a short trial on spread-out states of the study itself."""

from __future__ import annotations

import time
from dataclasses import dataclass

from localcomp.study import Study
from localcomp.sweep import SOLVED, Unit, units, work

TRIAL_SECONDS = 2.0
STARTUP_SECONDS = 1.0
"""Starting worker processes, measured; counts for short sweeps."""


@dataclass(frozen=True)
class Estimate:
    """A trial and what follows from it."""

    seconds: float
    tried: int
    failed: int
    trial_seconds: float


def estimate(study: Study, workers: int) -> Estimate:
    """Solve whole work units, spread over the study, for about two seconds, and scale up.

    Whole units, because states of a unit speed one another up; the first one is solved twice, the
    first time untimed, because a fresh process plans its transforms once.
    """
    every = units(study)
    middle_first = sorted(range(len(every)), key=lambda n: _spread(n, len(every)))
    tried = failed = 0
    seconds = 0.0
    for place, number in enumerate(middle_first):
        keys, cases = every[number]
        unit = Unit(cases[0].closure, study.accuracy, study.rule, tuple(keys),
                    tuple((case.mixture, case.state) for case in cases))  # fmt: skip
        if place == 0:
            work(unit)
        began = time.perf_counter()
        rows = work(unit)
        seconds += time.perf_counter() - began
        tried += len(rows)
        failed += sum(status not in SOLVED for _, status, _ in rows)
        if seconds > TRIAL_SECONDS:
            break
    total = len(study.cases)
    busy = min(workers, len(every))
    return Estimate(seconds / max(tried, 1) * total / busy + STARTUP_SECONDS * (workers > 1), tried, failed, seconds)


def _spread(number: int, count: int) -> float:
    """Van der Corput order: any beginning is spread over the whole."""
    bits = max(count - 1, 1).bit_length()
    return float(int(format(number, f"0{bits}b")[::-1], 2))
