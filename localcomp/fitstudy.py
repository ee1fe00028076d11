"""Every pair of a study put to the test, and a ternary predicted from its binaries."""

from __future__ import annotations

import itertools
from collections.abc import Callable, Sequence
from concurrent.futures import FIRST_COMPLETED, BrokenExecutor, Executor, wait
from dataclasses import dataclass, replace

import numpy as np

from localcomp.activity import activity_at_packing
from localcomp.auditplan import plan_audit
from localcomp.errors import BadInput, NoAnswer, Problem
from localcomp.fit import Array, fitted_ln_gamma
from localcomp.fitpair import THINNER, Misfit, PairResult, PairTask, examine_pair
from localcomp.models import LATTICE_COORDINATION, ActivityModel
from localcomp.study import Case, Study
from localcomp.sweep import WorkerLost
from ozsolve import Mixture

MOST_TEMPERATURES = 6
"""Of a fit; a study with more is thinned evenly."""

Progress = Callable[[int, int], None]


@dataclass(frozen=True)
class TernaryTest:
    """One model in one mixture of three, with the energies fitted to its binaries.

    Attributes
    ----------
    model : ActivityModel
    mole_fractions, truth, predicted : ndarray, shape (m, 3)
    """

    model: ActivityModel
    mole_fractions: Array
    truth: Array
    predicted: Array

    @property
    def misfit(self) -> Misfit:
        """Of ln gamma."""
        return Misfit.of(self.predicted - self.truth)


@dataclass(frozen=True)
class FitReport:
    """A study's fits.

    Attributes
    ----------
    study : Study
    pairs : tuple of PairResult
    ternaries : tuple of TernaryTest
    ternary_mixture : str
        What the ternary is; or why there is none.
    """

    study: Study
    pairs: tuple[PairResult, ...]
    ternaries: tuple[TernaryTest, ...]
    ternary_mixture: str


def pair_tasks(study: Study, models: Sequence[ActivityModel]) -> list[PairTask]:
    """One task per pair and packing fraction.

    Raises
    ------
    BadInput
        If the study has no pair, or no inner composition to fit.
    """
    closure = study.closures[0]
    cases = [case for case in study.cases if case.closure == closure]
    if any(case.mixture.species != 2 for case in cases):
        raise BadInput([Problem(str(study.path), "[[mixtures]]", "", "fits take pairs: two species each")])
    inner = sorted({case.state.mole_fractions[0] for case in cases} - {0.0, 1.0})
    if len(inner) < 2:
        allowed = "give at least two mole fractions strictly between 0 and 1 to fit"
        raise BadInput([Problem(str(study.path), "[conditions] composition", str(inner), allowed)])
    compositions = tuple(sorted({0.0, 1.0, *inner}))
    groups: dict[tuple[bytes, float], list[float]] = {}
    first: dict[tuple[bytes, float], Case] = {}
    for case in cases:
        pairs = case.mixture.pairs
        eta = round(case.mixture.packing_fraction(case.state), 12)
        key = pairs.diameter.tobytes() + pairs.well_depth.tobytes() + pairs.well_edge.tobytes(), eta
        groups.setdefault(key, [])
        first.setdefault(key, case)
        if case.state.temperature not in groups[key]:
            groups[key].append(case.state.temperature)
    z = study.audit.z if study.audit.z is not None else LATTICE_COORDINATION
    tasks = []
    for (identity, eta), temperatures in groups.items():
        others = [other for kept, other in groups if kept == identity and other != eta]
        nearest = min(others, key=lambda other: abs(other - eta)) if others else THINNER * eta
        labels = {k: v for k, v in first[identity, eta].labels.items() if k != "reduced_temperature"}
        tasks.append(
            PairTask(
                first[identity, eta].mixture, labels, _thinned(sorted(temperatures)), compositions, eta, nearest,
                tuple(models), z, study.accuracy, closure, study.rule,
            )
        )  # fmt: skip
    return tasks


def _thinned(values: list[float]) -> tuple[float, ...]:
    if len(values) <= MOST_TEMPERATURES:
        return tuple(values)
    pick = np.linspace(0, len(values) - 1, MOST_TEMPERATURES).round().astype(int)
    return tuple(values[int(n)] for n in pick)


def fit_study(
    study: Study, models: Sequence[ActivityModel], executor: Executor, progress: Progress | None = None
) -> FitReport:
    """Fit every pair, then predict a ternary.

    Raises
    ------
    BadInput
        If the study cannot be fitted.
    WorkerLost
        If a worker process died.
    """
    tasks = pair_tasks(study, models)
    ternary = ternary_tasks(study, tasks)
    total = len(tasks) + len(ternary)
    order = {executor.submit(examine_pair, task): n for n, task in enumerate([*tasks, *ternary])}
    results: dict[int, PairResult] = {}
    waiting = set(order)
    try:
        while waiting:
            done, waiting = wait(waiting, return_when=FIRST_COMPLETED)
            for future in done:
                results[order[future]] = future.result()
            if progress is not None:
                progress(len(results), total)
    except BrokenExecutor as error:
        raise WorkerLost(f"a worker process died ({error}); run the command again") from None
    finally:
        for future in waiting:
            future.cancel()
    pairs = tuple(results[n] for n in range(len(tasks)))
    tests, what = _predict_ternary(study, [results[len(tasks) + n] for n in range(len(ternary))])
    return FitReport(study, pairs, tests, what)


def _ternary_mixture(study: Study) -> tuple[Mixture, float, list[tuple[float, ...]], float] | None:
    """A mixture of three of the class, its coldest temperature there, compositions and packing fraction."""
    if study.kind != "class":
        return None
    plan = plan_audit(study, study.audit)
    if not plan.ternary:
        return None
    chosen = plan.ternary[0]
    rows = [
        case.state.mole_fractions for case in plan.ternary
        if case.mixture is chosen.mixture and case.state.temperature == chosen.state.temperature
    ]  # fmt: skip
    eta = chosen.mixture.packing_fraction(chosen.state)
    return chosen.mixture, chosen.state.temperature, list(dict.fromkeys(rows)), eta


def ternary_tasks(study: Study, tasks: list[PairTask]) -> list[PairTask]:
    """Fits of the three pairs of that mixture, at its temperature and packing fraction."""
    found = _ternary_mixture(study)
    if found is None:
        return []
    mixture, temperature, _, eta = found
    return [
        replace(
            tasks[0], mixture=mixture.subset(both), labels={"pair": f"{both[0] + 1} + {both[1] + 1}"},
            temperatures=(temperature,), packing_fraction=eta, other_packing=THINNER * eta,
            segment=float(mixture.diameter.min()),
        )
        for both in itertools.combinations(range(3), 2)
    ]  # fmt: skip


def _predict_ternary(study: Study, binaries: list[PairResult]) -> tuple[tuple[TernaryTest, ...], str]:
    found = _ternary_mixture(study)
    if found is None:
        return (), "no ternary: the study has one pair, or pairs without a class"
    mixture, temperature, rows, eta = found
    sizes, depths = mixture.diameter, np.diag(mixture.pairs.well_depth)
    what = (
        f"sigma {', '.join(f'{v:g}' for v in sizes)}; eps {', '.join(f'{v:g}' for v in depths)}; kT = {temperature:g}; "
        f"packing fraction {eta:g}"
    )
    reasons = [result.reason for result in binaries if result.reason]
    if reasons:
        return (), f"no ternary ({what}): {reasons[0]}"
    x = np.array(rows)
    try:
        (truth,) = activity_at_packing(
            mixture, temperature, eta, x, closure=study.closures[0], accuracy=study.accuracy, routes=False
        )
    except NoAnswer as reason:
        return (), f"no ternary ({what}): {reason}"
    tests = []
    for n, test in enumerate(binaries[0].tests):
        energies = np.zeros((3, 3))
        for (i, j), result in zip(itertools.combinations(range(3), 2), binaries, strict=True):
            pair = result.tests[n].energies
            energies[i, j], energies[j, i] = pair[0, 1], pair[1, 0]
        model, task, warmth = test.regression.model, binaries[0].task, np.full(len(x), temperature)
        predicted = fitted_ln_gamma(model, mixture, energies, warmth, x, task.z, task.segment)
        tests.append(TernaryTest(model, x, truth.ln_gamma, predicted))
    return tuple(tests), what
