"""Batches: every state as `solve` gives it, whatever company it is in."""

from __future__ import annotations

import numpy as np
import pytest

from ozsolve import CLOSURES, InputError, Mixture, Solution, State, solve, solve_many
from tests.problems import PROBLEMS, random_liquids

STATES = 1000
SEED = 20240519


def bars_apart(one: Solution, two: Solution) -> float:
    """Largest difference of two solutions in units of the sum of their error bars."""
    worst = 0.0
    for name in ("shell_integral", "contact", "energy", "virial", "inverse_compressibility"):
        difference = np.abs(np.asarray(getattr(one.observables, name)) - np.asarray(getattr(two.observables, name)))
        bars = np.asarray(getattr(one.errors, name)) + np.asarray(getattr(two.errors, name))
        worst = max(worst, float(np.max(difference / np.maximum(bars, 1e-300))))
    return worst


@pytest.mark.parametrize("closure", list(CLOSURES))
def test_a_thousand_random_states_equal_their_single_solves(closure: str) -> None:
    cases = [(mixture, state) for mixture, state, name in random_liquids(STATES, SEED) if name == closure]
    assert len(cases) == STATES // len(CLOSURES)
    found = solve_many(cases, closure=closure)
    usable = 0
    for (mixture, state), solution in zip(cases, found, strict=True):
        single = solve(mixture, state, closure=closure, on_failure="return")
        assert solution.status is single.status
        if single.status.usable:
            assert bars_apart(solution, single) <= 1.0
            assert solution.lowest_eigenvalue > 0.0
            usable += 1
        else:
            assert solution.branch_end_temperature == pytest.approx(single.branch_end_temperature, rel=1e-6)
    assert usable > 0.9 * len(cases)


def family(k_values: list[float], temperatures: list[float]) -> list[tuple[Mixture, State]]:
    return [
        (Mixture([1.0, 1.4], [1.0, 1.6], k=k), State(t, (0.35, 0.65), packing_fraction=0.39))
        for k in k_values
        for t in temperatures
    ]


@pytest.mark.parametrize("closure", list(CLOSURES))
def test_a_family_profits_and_stays_right(closure: str) -> None:
    cases = family([0.0, 0.05, 0.1, 0.15], [1.6, 1.9, 2.3, 2.8, 3.5])
    found = solve_many(cases, closure=closure)
    steps = []
    for case, solution in zip(cases, found, strict=True):
        single = solve(*case, closure=closure)
        assert bars_apart(solution, single) <= 1.0
        steps.append(solution.stats.steps / single.stats.steps)
    assert np.median(steps) < 0.5


def test_the_comparison_can_fail() -> None:
    cases = family([0.0], [2.0]) + family([0.001], [2.0])
    one, other = solve_many(cases)
    assert bars_apart(one, other) > 1.0


def test_order_and_company_do_not_matter() -> None:
    cases = [PROBLEMS[name] for name in PROBLEMS]
    straight = solve_many(cases)
    reverse = solve_many(cases[::-1])[::-1]
    for (mixture, state), one, two in zip(cases, straight, reverse, strict=True):
        assert one.mixture is mixture
        assert one.state is state
        assert bars_apart(one, two) <= 1.0


def test_mixed_failures_come_back_in_place() -> None:
    demixing = Mixture([1.0, 1.0], [1.0, 1.0], k=0.2)
    cases = [(demixing, State(t, (0.5, 0.5), packing_fraction=0.4)) for t in (2.0, 1.0, 1.6, 0.9)]
    found = solve_many(cases, closure="py")
    assert [s.status.usable for s in found] == [True, False, True, False]
    assert all(s.branch_end_temperature == pytest.approx(1.358, abs=0.005) for s in found if not s.status.usable)


def test_everything_a_solution_offers_is_there() -> None:
    (found,) = solve_many([PROBLEMS["unlike"]])
    single = solve(*PROBLEMS["unlike"])
    assert np.max(np.abs(found.g_r - single.g_r)) < 1e-4
    assert found.route_gap == pytest.approx(single.route_gap, abs=1e-3)
    value, bar = found.shell_integral(found.mixture.pairs.well_edge)
    assert np.all(np.abs(value - single.shell_integral(found.mixture.pairs.well_edge)[0]) <= 2 * bar)
    assert "solved" in repr(found)


def test_nothing_and_nonsense() -> None:
    assert solve_many([]) == []
    with pytest.raises(InputError):
        solve_many([PROBLEMS["unlike"]], closure="xyz")
    with pytest.raises(InputError):
        solve_many([PROBLEMS["unlike"]], accuracy=2.0)
