"""Paths in beta and partial energies against single solves."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from ozsolve import InputError, Mixture, State, solve, solve_paths

MIXTURE = Mixture([1.0, 1.3], [1.0, 1.4], k=0.05)
ENDS = [(MIXTURE, State(2.0, (x, 1.0 - x), packing_fraction=0.38)) for x in (0.0, 0.3, 0.5, 1.0)]
FRACTIONS = [0.1, 0.45, 0.8, 1.0]


@pytest.mark.parametrize("closure", ["rhnc", "hnc", "py", "msa"])
def test_paths_agree_with_single_solves(closure: str) -> None:
    found = solve_paths(ENDS, FRACTIONS, closure=closure, accuracy=1e-6)
    for (mixture, state), row in zip(ENDS, found, strict=True):
        for fraction, solution in zip(FRACTIONS, row, strict=True):
            there = replace(state, temperature=state.temperature / fraction)
            assert solution.state == there
            alone = solve(mixture, there, closure=closure, accuracy=1e-6)
            bar = float(solution.errors.energy + alone.errors.energy) * there.temperature
            assert abs(solution.internal_energy - alone.internal_energy) <= bar
            other = replace(there, temperature=1.01 * there.temperature)
            elsewhere = solve(mixture, other, closure=closure, accuracy=1e-6)
            assert abs(solution.internal_energy - elsewhere.internal_energy) > bar


def test_a_path_that_ends_says_so() -> None:
    ((first, last),) = solve_paths([(Mixture(1.0, 1.0), State(0.4, packing_fraction=0.2))], [0.1, 1.0])
    assert first.status.usable
    assert not last.status.usable
    assert np.isnan(last.internal_energy)


@pytest.mark.parametrize("fractions", [[], [0.0, 1.0], [0.5, 0.5], [0.5, 1.1], [1.0, 0.5]])
def test_fractions_must_rise_to_one_at_most(fractions: list[float]) -> None:
    with pytest.raises(InputError, match="fractions"):
        solve_paths(ENDS, fractions)


@pytest.mark.parametrize("closure", ["rhnc", "hnc", "py", "msa"])
@pytest.mark.parametrize("x", [0.0, 0.4])
def test_partial_energies_are_derivatives(closure: str, x: float) -> None:
    """dU/dN_j at constant volume by differences of solves; at zero density one-sided, second order."""
    state = State(2.0, (x, 1.0 - x), packing_fraction=0.38)
    here = solve(MIXTURE, state, closure=closure, accuracy=1e-7)
    rho, h = here.densities, 2e-4

    def density(change: np.ndarray) -> float:
        moved = rho + change
        total = float(moved.sum())
        there = State(2.0, tuple(moved / total), density=total)
        return solve(MIXTURE, there, closure=closure, accuracy=1e-9).internal_energy * total

    for j, unit in enumerate(np.eye(2)):
        if rho[j] > 0.0:
            slope = (density(h * unit) - density(-h * unit)) / (2.0 * h)
        else:
            slope = (-1.5 * density(0.0 * unit) + 2.0 * density(h * unit) - 0.5 * density(2.0 * h * unit)) / h
        assert here.partial_energies[j] == pytest.approx(slope, rel=2e-5)
        assert here.partial_energies[j] != pytest.approx(1.001 * slope, rel=2e-5)
    euler = here.internal_energy + here.energy_density_slope
    assert float(here.partial_energies @ [x, 1.0 - x]) == pytest.approx(euler, rel=1e-6)


def test_direct_correlation_integrals_give_the_compressibility() -> None:
    here = solve(MIXTURE, State(2.0, (0.4, 0.6), packing_fraction=0.38))
    x, rho = np.array([0.4, 0.6]), here.densities
    expected = 1.0 - float(x @ here.direct_correlation_integrals @ rho)
    assert here.inverse_compressibility == pytest.approx(expected, rel=1e-12)


def test_a_failed_state_has_no_partial_energies() -> None:
    cold = solve(Mixture(1.0, 1.0), State(0.3, packing_fraction=0.2), on_failure="return")
    assert np.isnan(cold.partial_energies).all()
