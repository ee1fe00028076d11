"""One pair put to the test: models unfitted and fitted against the true ln gamma, and what the fit implies."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace

import numpy as np

from localcomp.activity import activity_at_packing
from localcomp.errors import NoAnswer
from localcomp.fit import (
    Array,
    Regression,
    fitted_input,
    fitted_ln_gamma,
    pair_matrix,
    reading_of,
    regress,
    true_values,
)
from localcomp.models import ActivityModel, ModelInput, Reading, ln_gamma
from localcomp.neighbors import count_neighbors
from localcomp.shells import ShellRule
from localcomp.stability import stability_criterion, unstable_ranges
from ozsolve import Mixture, State, solve_many

GOOD_FIT = 0.02
"""Root mean square error of ln gamma up to which a fit counts as good: 2 % in gamma, as measurements scatter."""
BAD_RATIO = 0.15
"""Largest |ln(implied/true ratio)| beyond which the neighbours count as wrong: three of the audit's tolerances."""
WARMER = 1.25
THINNER = 0.9
"""Temperature and packing fraction of predictions outside the fit, as factors (another density of the study first)."""
SCAN = 201


@dataclass(frozen=True)
class PairTask:
    """What a worker is given.

    Attributes
    ----------
    mixture : Mixture
    labels : dict
    temperatures : tuple of float
        Of the fit, energy unit.
    compositions : tuple of float
        x_1, inner ones are fitted; the ends are predicted.
    packing_fraction, other_packing : float
        Of the fit and of the prediction.
    models : tuple of ActivityModel
    z, accuracy : float
    closure : str
    rule : ShellRule
    segment : float, optional
        Diameter that r and q are counted in; the smaller sphere of the pair unless given.
    """

    mixture: Mixture
    labels: dict[str, float | str]
    temperatures: tuple[float, ...]
    compositions: tuple[float, ...]
    packing_fraction: float
    other_packing: float
    models: tuple[ActivityModel, ...]
    z: float
    accuracy: float
    closure: str
    rule: ShellRule
    segment: float | None = None


@dataclass(frozen=True)
class Misfit:
    """Root mean square and largest difference of ln gamma, or of ln R; NaN where nothing could be compared."""

    rms: float
    largest: float

    @classmethod
    def of(cls, difference: Array) -> Misfit:
        """Over the finite ones."""
        good = difference[np.isfinite(difference)]
        if not good.size:
            return cls(float("nan"), float("nan"))
        return cls(float(np.sqrt(np.mean(good**2))), float(np.max(np.abs(good))))


@dataclass(frozen=True)
class ModelTest:
    """One model on one pair.

    Attributes
    ----------
    regression : Regression
    energies : ndarray, shape (2, 2)
        As `fit.pair_matrix`.
    multiplicity : ndarray, shape (p,)
        Fitted energies over those of one contact.
    unfitted : dict
        By reading: true energies put in.
    dilution, other_temperature, other_density : Misfit
        Of ln gamma predicted outside the fit.
    ratios : Misfit
        Of ln R implied by the fitted energies.
    implied : ndarray, shape (n, 2)
        R_12 and R_21 implied, for every state of the pair.
    splits : list of (float, float)
        Ranges of x_1 where the fitted model splits at the lowest temperature.
    """

    regression: Regression
    energies: Array
    multiplicity: Array
    unfitted: dict[Reading, Misfit]
    dilution: Misfit
    other_temperature: Misfit
    other_density: Misfit
    ratios: Misfit
    implied: Array
    splits: list[tuple[float, float]]

    @property
    def verdict(self) -> str:
        """What good fit and neighbours together say."""
        if self.regression.rms > GOOD_FIT:
            return "does not fit"
        if np.isfinite(self.ratios.largest) and self.ratios.largest > BAD_RATIO:
            return "right for the wrong reason"
        return "right for the right reason" if np.isfinite(self.ratios.largest) else "fits; neighbours not compared"


@dataclass(frozen=True)
class PairResult:
    """All models on one pair; n states: every temperature at every composition.

    Attributes
    ----------
    task : PairTask
    reason : str
        Why there is no truth to fit; empty otherwise.
    temperature, x : ndarray, shape (n,)
    ln_gamma, ratios : ndarray, shape (n, 2)
        True ones; R_12 and R_21.
    numerical_error : float
        Largest error bar of the true ln gamma.
    tests : tuple of ModelTest
    left_out : tuple of float
        Temperatures of the study without activity coefficients; not in `task` any more.
    """

    task: PairTask
    reason: str = ""
    temperature: Array = field(default_factory=lambda: np.zeros(0))
    x: Array = field(default_factory=lambda: np.zeros(0))
    ln_gamma: Array = field(default_factory=lambda: np.zeros((0, 2)))
    ratios: Array = field(default_factory=lambda: np.zeros((0, 2)))
    numerical_error: float = float("nan")
    tests: tuple[ModelTest, ...] = ()
    left_out: tuple[float, ...] = ()


def examine_pair(task: PairTask) -> PairResult:
    """Truth, fits, predictions and implied neighbours of one pair."""
    x = np.array(task.compositions)
    rows = np.column_stack([x, 1.0 - x])
    warmer = WARMER * max(task.temperatures)
    truth, bars, reason = _truth(task, [*task.temperatures, warmer], task.packing_fraction, rows)
    kept = np.array([bool(np.isfinite(part).any()) for part in truth[:-1]])
    if not kept.any():
        return PairResult(task, reason)
    left_out = tuple(t for t, good in zip(task.temperatures, kept, strict=True) if not good)
    task = replace(task, temperatures=tuple(t for t, good in zip(task.temperatures, kept, strict=True) if good))
    temperature = np.repeat(task.temperatures, len(x))
    target = np.concatenate(truth[:-1][kept])
    everywhere = np.tile(rows, (len(task.temperatures), 1))
    inner = (everywhere[:, 0] > 0.0) & (everywhere[:, 0] < 1.0)
    if int(np.isfinite(target[inner]).sum()) <= 2:
        return PairResult(task, "no activity coefficients to fit: the paths cross the two-phase region")
    ratios = _true_ratios(task, temperature, everywhere)
    thinner = np.concatenate(_truth(task, task.temperatures, task.other_packing, rows)[0])
    tests = []
    for model in task.models:
        fit = regress(model, task.mixture, temperature[inner], everywhere[inner], target[inner], task.z, task.segment)
        tests.append(_test(task, fit, temperature, everywhere, target, ratios, truth[-1], rows, warmer, thinner))
    bars = bars[:-1][kept]
    return PairResult(
        task, "", temperature, everywhere[:, 0], target, ratios,
        float(np.nanmax(bars)) if np.isfinite(bars).any() else float("nan"), tuple(tests), left_out,
    )  # fmt: skip


def _true_ratios(task: PairTask, temperature: Array, rows: Array) -> Array:
    states = [
        (task.mixture, State(float(t), tuple(x), packing_fraction=task.packing_fraction))
        for t, x in zip(temperature, rows, strict=True)
    ]
    out = np.full((len(states), 2), np.nan)
    for n, solution in enumerate(solve_many(states, closure=task.closure, accuracy=task.accuracy)):
        if solution.status.usable:
            try:
                table = count_neighbors(solution, task.rule).neighbor_ratios
            except NoAnswer:
                continue
            out[n] = table[0, 1], table[1, 0]
    return out


def _truth(task: PairTask, temperatures: Sequence[float], eta: float, rows: Array) -> tuple[Array, Array, str]:
    """True ln gamma and error bars, each of shape (temperatures, m, 2), and why some isotherm is NaN throughout."""
    try:
        found = activity_at_packing(
            task.mixture, list(temperatures), eta, rows, closure=task.closure, accuracy=task.accuracy, routes=False
        )
    except NoAnswer as reason:  # a pure liquid is missing at one temperature: the others one by one
        if len(temperatures) == 1:
            nothing = np.full((1, *rows.shape), np.nan)
            return nothing, nothing, str(reason)
        parts = [_truth(task, [t], eta, rows) for t in temperatures]
        reasons = [part[2] for part in parts if part[2]]
        return np.concatenate([part[0] for part in parts]), np.concatenate([part[1] for part in parts]), reasons[0]
    return np.stack([part.ln_gamma for part in found]), np.stack([part.numerical_error for part in found]), ""


def _test(
    task: PairTask, fit: Regression, temperature: Array, rows: Array, target: Array, ratios: Array, warm: Array,
    single: Array, warmer: float, thinner: Array,
) -> ModelTest:  # fmt: skip
    model, mixture = fit.model, task.mixture
    energies = pair_matrix(model, fit.values)

    def predicted(t: Array, x: Array) -> Array:
        with np.errstate(over="ignore", invalid="ignore"):
            return fitted_ln_gamma(model, mixture, energies, t, x, task.z, task.segment)

    here = predicted(temperature, rows)
    dilute = np.where(rows == 0.0, here - target, np.nan)
    with np.errstate(over="ignore", invalid="ignore", divide="ignore"):
        given = fitted_input(model, mixture, energies, temperature, rows, task.z, task.segment)
        stated = model.ratios(given, reading_of(model))
        implied = np.column_stack([stated[:, 0, 1], stated[:, 1, 0]])
        off = np.log(implied / ratios)
    one = true_values(model, mixture)
    raw = {reading: unfitted(model, reading, mixture, temperature, rows, task.z) for reading in Reading}
    grid = np.linspace(0.0, 1.0, SCAN)[1:-1]
    lowest = np.full(len(grid), min(task.temperatures))
    scan = predicted(lowest, np.column_stack([grid, 1.0 - grid]))
    return ModelTest(
        fit,
        energies,
        np.divide(fit.values, one, out=np.full_like(one, np.nan), where=np.abs(one) > 1e-9),
        {reading: Misfit.of(values - target) for reading, values in raw.items()},
        Misfit.of(dilute),
        Misfit.of(predicted(np.full(len(single), warmer), single) - warm),
        Misfit.of(here - thinner),
        Misfit.of(off),
        implied,
        unstable_ranges(grid, stability_criterion(grid, scan)),
    )


def unfitted(
    model: ActivityModel, reading: Reading, mixture: Mixture, temperature: Array, rows: Array, z: float
) -> Array:
    """ln gamma of a model with the true energies put in, shape (n, s)."""
    count, size = rows.shape
    given = ModelInput(
        mixture.pairs.well_depth / temperature[:, None, None],
        np.broadcast_to(mixture.diameter, (count, size)),
        rows,
        np.broadcast_to(mixture.pairs.diameter, (count, size, size)),
        np.full(count, z),
    )
    with np.errstate(over="ignore", invalid="ignore"):
        return ln_gamma(model, given, reading)
