"""Error bars: honest over random liquids, and meaningful when the accuracy changes."""

from __future__ import annotations

from dataclasses import dataclass, fields

import numpy as np
import pytest

from ozsolve import Mixture, Solution, State, Status, solve
from tests.problems import random_liquids, random_states

STATES = 200
SEED = 20261201
"""Fixed before it was first run; no constant of the error bars has been tuned on these states. A seed that
has been used for tuning no longer shows anything: replace it by one chosen beforehand, not by one that passes."""
ENDS = (Status.BRANCH_END, Status.UNSTABLE_FLUID)
MAX_STEPS = 5000
"""No state takes more evaluations of the map; the worst of 2,600 such liquids took 3,104."""


@dataclass(frozen=True)
class Record:
    """One random liquid at the default accuracy, held against accuracy 1e-9."""

    closure: str
    rough: Status
    truth: Status
    steps: int
    ends: tuple[float | None, float | None]
    lowest: float
    bars: float
    counts: float
    share: float


def errors_in_bars(rough: Solution, truth: Solution) -> dict[str, float]:
    """Largest error of every reported number, in units of its own bar."""
    out = {}
    for field in fields(rough.observables):
        error = np.abs(getattr(rough.observables, field.name) - getattr(truth.observables, field.name))
        out[field.name] = float(np.max(error / getattr(rough.errors, field.name)))
    return out


def error_in_bars(rough: Solution, truth: Solution) -> float:
    return max(errors_in_bars(rough, truth).values())


def record(mixture: Mixture, state: State, closure: str) -> Record:
    rough = solve(mixture, state, closure=closure, on_failure="return")
    truth = solve(mixture, state, closure=closure, accuracy=1e-9, on_failure="return")
    steps, ends = (
        max(rough.stats.steps, truth.stats.steps),
        (rough.branch_end_temperature, truth.branch_end_temperature),
    )
    if not (rough.status.usable and truth.status.usable):
        nan = float("nan")
        return Record(closure, rough.status, truth.status, steps, ends, nan, nan, nan, nan)
    counts = np.abs(rough.observables.shell_integral / truth.observables.shell_integral - 1.0)
    return Record(
        closure, rough.status, truth.status, steps, ends, min(rough.lowest_eigenvalue, truth.lowest_eigenvalue),
        error_in_bars(rough, truth), float(counts.max()), truth.relative_error / rough.relative_error,
    )  # fmt: skip


@pytest.fixture(scope="module")
def liquids() -> list[Record]:
    return [record(*case) for case in random_liquids(STATES, SEED)]


@pytest.fixture(scope="module")
def solved(liquids: list[Record]) -> list[Record]:
    return [r for r in liquids if r.rough.usable]


def check_bars(off: np.ndarray) -> None:
    """At least 95 % covered, none off by more than five bars."""
    assert np.mean(off <= 1.0) >= 0.95
    assert np.max(off) <= 5.0


def test_bars_cover_the_true_error_over_random_liquids(solved: list[Record]) -> None:
    """Every reported number of a state counts: a state is covered when all of them are."""
    assert max(r.share for r in solved) < 0.05, "what serves as the truth is not precise enough"
    off = np.array([r.bars for r in solved])
    check_bars(off)
    with pytest.raises(AssertionError):
        check_bars(3.0 * off)  # bars a third of their size
    with pytest.raises(AssertionError):
        check_bars(np.append(off, 5.1))


def test_counts_keep_the_accuracy_asked_over_random_liquids(solved: list[Record]) -> None:
    assert max(r.counts for r in solved) <= 1e-5


def test_every_random_liquid_ends_with_a_name_in_bounded_work(liquids: list[Record]) -> None:
    for r in liquids:
        assert r.steps <= MAX_STEPS
        assert r.rough.usable == r.truth.usable
        if not r.rough.usable:
            assert r.rough in ENDS
            assert r.truth in ENDS
            assert r.ends[0] == pytest.approx(r.ends[1], rel=5e-3)
    assert sum(not r.rough.usable for r in liquids) <= 0.1 * STATES
    assert {r.closure for r in liquids} == {"msa", "py", "hnc", "rhnc"}


def test_no_random_liquid_is_on_a_false_root(solved: list[Record]) -> None:
    """I - C(k) positive definite at every k, at both accuracies; the branch itself: test_physical_root.py."""
    assert min(r.lowest for r in solved) > 0.0


@pytest.mark.parametrize("seed", [11, 12])
def test_any_state_ends_with_a_name_in_bounded_work(seed: int) -> None:
    usable = 0
    for mixture, state, closure in random_states(150, seed):
        found = solve(mixture, state, closure=closure, on_failure="return")
        assert found.stats.steps <= 2 * MAX_STEPS
        if found.status.usable:
            usable += 1
            assert found.lowest_eigenvalue > 0.0
        else:
            assert found.status in ENDS
            assert np.isnan(found.internal_energy)
            assert found.branch_end_temperature is None or found.branch_end_temperature > state.temperature
    assert 40 < usable < 110, "the draw should hold both kinds"


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
