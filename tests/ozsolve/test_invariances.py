"""What must not change anything, and what must change with it."""

from __future__ import annotations

import numpy as np
import pytest

from ozsolve import CLOSURES, Mixture, Solution, State, solve

SIGMA, DEPTH, X = np.array([1.0, 1.4, 1.2]), np.array([1.0, 1.5, 0.7]), np.array([0.5, 0.3, 0.2])
BASE = (Mixture(SIGMA, DEPTH, k=0.1), State(2.0, tuple(X), packing_fraction=0.38))
TOLERANCE = 2e-6
"""Grids follow the smallest diameter, so equal physics gives equal grids; residuals differ within tolerance."""


def same(one: Solution, two: Solution, order: list[int], length: float = 1.0, energy: float = 1.0) -> None:
    pick = np.ix_(order, order)
    for name in ("shell_integral", "contact", "inner_edge"):
        unit = length**3 if name == "shell_integral" else 1.0
        scale = [getattr(s.observables, name) * (s.length**3 if name == "shell_integral" else 1.0) for s in (one, two)]
        assert np.max(np.abs(scale[1][pick] / (unit * scale[0]) - 1.0)) < TOLERANCE
    assert two.internal_energy == pytest.approx(energy * one.internal_energy, rel=TOLERANCE)
    assert two.virial_z == pytest.approx(one.virial_z, abs=TOLERANCE * 30)
    assert two.inverse_compressibility == pytest.approx(one.inverse_compressibility, rel=TOLERANCE * 10)


@pytest.mark.parametrize("closure", list(CLOSURES))
def test_relabelling_permutes_the_answer(closure: str) -> None:
    order = [2, 0, 1]
    other = Mixture(SIGMA[order], DEPTH[order], k=0.1)
    two = solve(other, State(2.0, tuple(X[order]), packing_fraction=0.38), closure=closure)
    same(solve(*BASE, closure=closure), two, [order.index(i) for i in range(3)])


@pytest.mark.parametrize("closure", list(CLOSURES))
def test_splitting_a_species_changes_nothing(closure: str) -> None:
    pair = Mixture([1.0, 1.5], [1.0, 1.5])
    split = Mixture([1.0, 1.5, 1.5], [1.0, 1.5, 1.5])
    one = solve(pair, State(2.0, (0.4, 0.6), packing_fraction=0.38), closure=closure)
    two = solve(split, State(2.0, (0.4, 0.25, 0.35), packing_fraction=0.38), closure=closure)
    for i, j in ((0, 1), (1, 1), (2, 2), (1, 2), (2, 0)):
        a, b = min(i, 1), min(j, 1)
        assert two.observables.shell_integral[i, j] == pytest.approx(
            one.observables.shell_integral[a, b], rel=TOLERANCE
        )
    assert two.internal_energy == pytest.approx(one.internal_energy, rel=TOLERANCE)
    assert two.virial_z == pytest.approx(one.virial_z, abs=30 * TOLERANCE)


@pytest.mark.parametrize("factor", [0.01, 3.4])
def test_scaling_all_lengths(factor: float) -> None:
    two = solve(Mixture(factor * SIGMA, DEPTH, k=0.1), BASE[1])
    same(solve(*BASE), two, [0, 1, 2], length=factor)


@pytest.mark.parametrize("factor", [0.01, 114.9])
def test_scaling_all_energies(factor: float) -> None:
    state = State(2.0 * factor, tuple(X), packing_fraction=0.38)
    same(solve(*BASE), solve(Mixture(SIGMA, factor * DEPTH, k=0.1), state), [0, 1, 2], energy=factor)


def test_the_check_sees_a_real_change() -> None:
    with pytest.raises(AssertionError):
        same(solve(*BASE), solve(Mixture(SIGMA, DEPTH, k=0.1001), BASE[1]), [0, 1, 2])


@pytest.mark.parametrize("closure", list(CLOSURES))
@pytest.mark.parametrize("trace", [1e-12, 0.0])
def test_a_trace_species_leaves_the_solvent_alone(closure: str, trace: float) -> None:
    pure = solve(Mixture(1.0, 1.0), State(2.0, packing_fraction=0.4), closure=closure)
    mixture = Mixture([1.0, 1.3], [1.0, 1.5], k=0.1)
    two = solve(mixture, State(2.0, (1.0 - trace, trace), packing_fraction=0.4), closure=closure)
    assert two.observables.shell_integral[0, 0] == pytest.approx(pure.observables.shell_integral[0, 0], rel=1e-5)
    assert two.internal_energy == pytest.approx(pure.internal_energy, rel=1e-5)
    near = solve(mixture, State(2.0, (1.0 - 1e-4, 1e-4), packing_fraction=0.4), closure=closure)
    for i, j in ((0, 1), (1, 1)):  # the dilute pairs go smoothly to their limit
        found, close = two.observables.shell_integral[i, j], near.observables.shell_integral[i, j]
        assert found == pytest.approx(close, rel=1e-3)


@pytest.mark.parametrize("name", ["g_r", "h_r", "c_r", "gamma_r", "structure_factors", "c_k"])
def test_arrays_are_symmetric_and_read_only(name: str) -> None:
    array = getattr(solve(*BASE), name)
    assert np.array_equal(array, np.swapaxes(array, 0, 1)) or np.allclose(array, np.swapaxes(array, 0, 1), rtol=1e-12)
    with pytest.raises(ValueError, match="read-only"):
        array[0, 0, 0] = 1.0
