"""Shell rules: well edge, fixed multiple, first minimum of g."""

from __future__ import annotations

from types import SimpleNamespace
from typing import Any, cast

import numpy as np
import pytest

from localcomp.errors import NoAnswer
from localcomp.neighbors import count_neighbors
from localcomp.shells import RULES, FirstMinimum, FixedMultiple, WellEdge, make_rule
from ozsolve import Mixture, Solution, State, solve
from tests.problems import random_liquids


def drawn(inside: Any, beyond: Any, edge: float, core: float = 1.0) -> Solution:
    """A solution of one species whose g is drawn by hand: `inside` up to the well edge, `beyond` it."""
    r = 0.02 * np.arange(1, 400)
    g = np.where(r < core, 0.0, np.where(r < edge, inside(r), beyond(r)))
    pairs = SimpleNamespace(diameter=np.array([[core]]), well_edge=np.array([[edge]]))
    fake = SimpleNamespace(
        mixture=SimpleNamespace(species=1, pairs=pairs),
        r=r,
        g_r=g[None, None, :],
        g_segments=lambda *, rough: (r, inside(r)[None, None, :], beyond(r)[None, None, :]),
    )
    return cast(Solution, fake)


def wave(phase: float, level: float = 1.0, period: float = 1.0) -> Any:
    """A cosine with its first minimum beyond contact at r = phase."""
    return lambda r: level - 0.3 * np.cos(2.0 * np.pi * (r - phase) / period)


def first_minimum(solution: Solution) -> float:
    return float(FirstMinimum().radius(solution)[0, 0])


def test_smooth_minimum_beyond_the_edge():
    assert first_minimum(drawn(wave(1.45, 2.0), wave(1.45), 1.3)) == pytest.approx(1.45, abs=1e-6)


def test_smooth_minimum_inside_the_well():
    assert first_minimum(drawn(wave(1.3712, 2.0), wave(1.3712), 1.6)) == pytest.approx(1.3712, abs=1e-6)


def test_the_edge_itself_when_g_falls_to_it_and_rises_beyond():
    falling, rising = (lambda r: 3.0 - r), (lambda r: 1.0 + 0.5 * np.sin(2.0 * (r - 1.5)))
    assert first_minimum(drawn(falling, rising, 1.5)) == 1.5


def test_a_shoulder_steps_up_and_is_no_minimum():
    falling, high = (lambda r: 0.9 - 0.1 * r), wave(1.9, 1.5)
    assert first_minimum(drawn(falling, high, 1.5)) == pytest.approx(1.9, abs=1e-6)


def test_first_minimum_of_a_solved_fluid_is_where_the_finest_grid_has_it():
    fluid, state = Mixture([1.0, 1.5], [1.0, 1.5], k=0.1), State(2.0, (0.5, 0.5), packing_fraction=0.40)
    radius = FirstMinimum().radius(solve(fluid, state))
    fine = solve(fluid, state, accuracy=1e-8)
    for i, j in ((0, 0), (0, 1), (1, 1)):
        core = fluid.pairs.diameter[i, j]
        window = (fine.r > core + 0.1) & (fine.r < 2.0 * core)
        g = np.where(window, fine.g_r[i, j], np.inf)
        lowest = int(np.argmin(g))
        if abs(fine.r[lowest] - fluid.pairs.well_edge[i, j]) > 0.02:
            inside_well = radius[i, j] < fluid.pairs.well_edge[i, j]
            if inside_well:  # a minimum before the step down at the edge comes first
                window &= fine.r < fluid.pairs.well_edge[i, j]
                lowest = int(np.argmin(np.where(window, fine.g_r[i, j], np.inf)))
            assert radius[i, j] == pytest.approx(fine.r[lowest], abs=1.5 * (fine.r[1] - fine.r[0]))


def test_well_edge_and_multiple_of_a_mixture():
    fluid = Mixture([1.0, 2.0], [1.0, 1.0], [1.5, 1.8])
    solution = solve(fluid, State(3.0, (0.5, 0.5), packing_fraction=0.2), accuracy=1e-3)
    # lam_ij sigma_ij = (lam_i sigma_i + lam_j sigma_j)/2
    assert WellEdge().radius(solution) == pytest.approx(np.array([[1.5, 2.55], [2.55, 3.6]]))
    assert FixedMultiple(1.4).radius(solution) == pytest.approx(1.4 * np.array([[1.0, 1.5], [1.5, 2.0]]))


def test_the_words_of_the_files():
    assert [make_rule(name).name for name in RULES] == list(RULES)
    assert make_rule("multiple", 1.7) == FixedMultiple(1.7)
    assert make_rule("multiple", 1.7).description == "1.7 sigma_ij"


@pytest.mark.parametrize("rule", RULES)
def test_bars_under_every_rule_cover_the_error(rule: str) -> None:
    """Counts, fractions and ratios of random liquids against accuracy 1e-9: at least 95 % within their bars, none off
    by five; the radius of a first minimum moves with the grid and is part of the bar."""
    worst, without_radius = [], []
    for mixture, state, closure in random_liquids(60, 20261201):
        rough = solve(mixture, state, closure=closure, on_failure="return")
        if not rough.status.usable:
            continue
        try:
            found = count_neighbors(rough, make_rule(rule, 1.37))
        except NoAnswer:
            continue
        exact = count_neighbors(solve(mixture, state, closure=closure, accuracy=1e-9), make_rule(rule, 1.37))
        for value, bar in (
            ("coordination_numbers", found.coordination_errors), ("local_mole_fractions", found.fraction_errors),
            ("neighbor_ratios", found.ratio_errors),
        ):  # fmt: skip
            off = np.abs(getattr(found, value) - getattr(exact, value))
            worst.append(float(np.max(off / np.where(bar > 0.0, bar, np.inf))))
        counts = np.abs(found.coordination_numbers - exact.coordination_numbers)
        without_radius.append(float(np.max(counts / (rough.relative_error * found.coordination_numbers))))
    assert len(worst) > 150
    assert np.mean(np.array(worst) <= 1.0) >= 0.95
    assert max(worst) <= 5.0
    if rule == "first_minimum":
        assert np.mean(np.array(without_radius) <= 1.0) < 0.5, "without the radius the bars would not cover"
