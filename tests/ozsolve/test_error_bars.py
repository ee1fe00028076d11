"""Error bars: honest over random liquids, and meaningful when the accuracy changes."""

from __future__ import annotations

import numpy as np
import pytest

from ozsolve import Mixture, Solution, State, Status, solve
from tests.problems import random_liquids

STATES = 200
SEED = 20240917
FIELDS = ("shell_integral", "contact", "inner_edge", "energy", "virial", "inverse_compressibility")


def error_in_bars(rough: Solution, truth: Solution) -> float:
    """Largest error over all reported numbers, in units of their own bars."""
    worst = 0.0
    for name in FIELDS:
        error = np.abs(np.asarray(getattr(rough.observables, name)) - np.asarray(getattr(truth.observables, name)))
        worst = max(worst, float(np.max(error / np.asarray(getattr(rough.errors, name)))))
    return worst


def test_bars_cover_the_true_error_over_random_liquids() -> None:
    covered = met = total = failed = 0
    worst = 0.0
    for mixture, state, closure in random_liquids(STATES, SEED):
        rough = solve(mixture, state, closure=closure, on_failure="return")
        truth = solve(mixture, state, closure=closure, accuracy=1e-9, on_failure="return")
        assert rough.status.usable == truth.status.usable
        if not rough.status.usable:
            assert rough.status in (Status.BRANCH_END, Status.UNSTABLE_FLUID)
            assert rough.branch_end_temperature == pytest.approx(truth.branch_end_temperature, rel=5e-3)
            failed += 1
            continue
        assert rough.lowest_eigenvalue > 0.0
        counts = np.abs(rough.observables.shell_integral / truth.observables.shell_integral - 1.0)
        assert counts.max() <= 2e-5
        met += counts.max() <= 1e-5
        off = error_in_bars(rough, truth)
        worst = max(worst, off)
        covered += off <= 1.0
        total += 1
    assert failed <= 0.1 * STATES
    assert covered >= 0.95 * total
    assert met >= 0.98 * total  # the accuracy asked, with the confidence of the bars
    assert worst <= 5.0


def test_bars_that_are_too_small_would_be_caught() -> None:
    shrunk = 0
    for mixture, state, closure in random_liquids(12, SEED):
        rough = solve(mixture, state, closure=closure, on_failure="return")
        if rough.status.usable:
            truth = solve(mixture, state, closure=closure, accuracy=1e-9)
            shrunk += error_in_bars(rough, truth) > 0.01  # bars a hundred times smaller
    assert shrunk > 6


@pytest.mark.parametrize("accuracy", [1e-3, 1e-5, 1e-7])
def test_the_accuracy_asked_is_reached(accuracy: float) -> None:
    mixture, state = Mixture([1.0, 1.6], [1.0, 1.2]), State(1.8, (0.4, 0.6), packing_fraction=0.4)
    found, truth = solve(mixture, state, accuracy=accuracy), solve(mixture, state, accuracy=1e-9)
    off = np.abs(found.observables.shell_integral / truth.observables.shell_integral - 1.0)
    assert off.max() <= accuracy
    assert found.relative_error <= accuracy


def test_long_correlations_get_a_longer_grid() -> None:
    """Near the stability limit of PY (about kT = 1.17 at this density) correlations outgrow the first extent."""
    far = solve(Mixture(1.0, 1.0), State(3.0, packing_fraction=0.15), closure="py")
    near = solve(Mixture(1.0, 1.0), State(1.2, packing_fraction=0.15), closure="py")
    assert near.stats.extent > 1.5 * far.stats.extent
    finer = solve(Mixture(1.0, 1.0), State(1.2, packing_fraction=0.15), closure="py", accuracy=1e-8)
    assert error_in_bars(near, finer) <= 1.0
