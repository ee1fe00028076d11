"""What must not change anything, and what must change with it."""

from __future__ import annotations

import numpy as np
import pytest

from ozsolve import CLOSURES, Mixture, Solution, State, solve

SIGMA, DEPTH, X = np.array([1.0, 1.4, 1.2]), np.array([1.0, 1.5, 0.7]), np.array([0.5, 0.3, 0.2])
BASE = (Mixture(SIGMA, DEPTH, k=0.1), State(2.0, tuple(X), packing_fraction=0.38))
TOLERANCES = {1e-5: 5e-7, 1e-9: 1e-11}
"""By accuracy. Grids follow the smallest diameter, so equal physics gives equal grids; what is left is the
residual at which the iteration stops."""
BOTH = pytest.mark.parametrize("accuracy", list(TOLERANCES))


def same(one: Solution, two: Solution, order: list[int], length: float = 1.0, energy: float = 1.0) -> None:
    """Species n of `one` is species order[n] of `two`."""
    tolerance = TOLERANCES[one.accuracy]
    pick = np.ix_(order, order)
    for name in ("shell_integral", "contact", "inner_edge"):
        unit = length**3 if name == "shell_integral" else 1.0
        scale = [getattr(s.observables, name) * (s.length**3 if name == "shell_integral" else 1.0) for s in (one, two)]
        assert np.max(np.abs(scale[1][pick] / (unit * scale[0]) - 1.0)) < tolerance
    assert two.internal_energy == pytest.approx(energy * one.internal_energy, rel=tolerance)
    assert two.virial_z == pytest.approx(one.virial_z, abs=tolerance)
    assert two.inverse_compressibility == pytest.approx(one.inverse_compressibility, rel=tolerance)


@BOTH
@pytest.mark.parametrize("closure", list(CLOSURES))
def test_relabelling_permutes_the_answer(closure: str, accuracy: float) -> None:
    order = [2, 0, 1]
    other = Mixture(SIGMA[order], DEPTH[order], k=0.1)
    two = solve(other, State(2.0, tuple(X[order]), packing_fraction=0.38), closure=closure, accuracy=accuracy)
    one = solve(*BASE, closure=closure, accuracy=accuracy)
    same(one, two, [order.index(i) for i in range(3)])
    with pytest.raises(AssertionError):
        same(one, two, order)


@BOTH
@pytest.mark.parametrize("closure", list(CLOSURES))
def test_splitting_a_species_changes_nothing(closure: str, accuracy: float) -> None:
    x, parts = (0.4, 0.6), (0.4, 0.25, 0.35)
    state, finer = State(2.0, x, packing_fraction=0.38), State(2.0, parts, packing_fraction=0.38)
    one = solve(Mixture([1.0, 1.5], [1.0, 1.5]), state, closure=closure, accuracy=accuracy)
    two = solve(Mixture([1.0, 1.5, 1.5], [1.0, 1.5, 1.5]), finer, closure=closure, accuracy=accuracy)
    same(one, two, [0, 1])
    same(one, two, [0, 2])
    across = two.observables.shell_integral[1, 2]
    assert across == pytest.approx(one.observables.shell_integral[1, 1], rel=TOLERANCES[accuracy])
    not_quite = solve(Mixture([1.0, 1.5, 1.5], [1.0, 1.5, 1.5001]), finer, closure=closure, accuracy=accuracy)
    with pytest.raises(AssertionError):
        same(one, not_quite, [0, 1])


@BOTH
@pytest.mark.parametrize("closure", list(CLOSURES))
@pytest.mark.parametrize("factor", [0.01, 3.4])
def test_scaling_all_lengths(factor: float, closure: str, accuracy: float) -> None:
    one = solve(*BASE, closure=closure, accuracy=accuracy)
    two = solve(Mixture(factor * SIGMA, DEPTH, k=0.1), BASE[1], closure=closure, accuracy=accuracy)
    same(one, two, [0, 1, 2], length=factor)
    with pytest.raises(AssertionError):
        same(one, two, [0, 1, 2], length=1.001 * factor)


@BOTH
@pytest.mark.parametrize("closure", list(CLOSURES))
@pytest.mark.parametrize("factor", [0.01, 114.9])
def test_scaling_all_energies(factor: float, closure: str, accuracy: float) -> None:
    one = solve(*BASE, closure=closure, accuracy=accuracy)
    state = State(2.0 * factor, tuple(X), packing_fraction=0.38)
    two = solve(Mixture(SIGMA, factor * DEPTH, k=0.1), state, closure=closure, accuracy=accuracy)
    same(one, two, [0, 1, 2], energy=factor)


@BOTH
def test_the_check_sees_a_real_change(accuracy: float) -> None:
    for changed in (Mixture(SIGMA, DEPTH, k=0.1001), Mixture(SIGMA, 1.0001 * DEPTH, k=0.1)):
        with pytest.raises(AssertionError):
            same(solve(*BASE, accuracy=accuracy), solve(changed, BASE[1], accuracy=accuracy), [0, 1, 2])


def trace_state(x: float, closure: str) -> Solution:
    mixture = Mixture([1.0, 1.3], [1.0, 1.5], k=0.1)
    return solve(mixture, State(2.0, (1.0 - x, x), packing_fraction=0.4), closure=closure, accuracy=1e-9)


def check_solvent_alone(pure: Solution, mixed: Solution) -> None:
    """The solvent as if the trace were not there; different mixtures have different grids."""
    for name in ("shell_integral", "contact", "inner_edge"):
        found, expected = (getattr(s.observables, name)[0, 0] for s in (mixed, pure))
        assert found == pytest.approx(expected, rel=1e-8)
    assert mixed.internal_energy == pytest.approx(pure.internal_energy, rel=1e-8)
    assert mixed.inverse_compressibility == pytest.approx(pure.inverse_compressibility, rel=1e-8)


@pytest.mark.parametrize("closure", list(CLOSURES))
def test_a_trace_species_leaves_the_solvent_alone(closure: str) -> None:
    pure = solve(Mixture(1.0, 1.0), State(2.0, packing_fraction=0.4), closure=closure, accuracy=1e-9)
    none, trace, some = (trace_state(x, closure) for x in (0.0, 1e-12, 1e-4))
    check_solvent_alone(pure, none)
    check_solvent_alone(pure, trace)
    with pytest.raises(AssertionError):
        check_solvent_alone(pure, some)
    # the dilute pairs go smoothly to their limit, at a rate in proportion to the fraction
    limit = none.observables.shell_integral
    assert np.max(np.abs(trace.observables.shell_integral / limit - 1.0)) < 1e-10
    twice = trace_state(2e-4, closure).observables.shell_integral / limit - 1.0
    assert np.max(np.abs(twice - 2.0 * (some.observables.shell_integral / limit - 1.0))) < 1e-7
    assert np.max(np.abs(twice)) > 1e-5


@pytest.mark.parametrize("name", ["g_r", "h_r", "c_r", "gamma_r", "structure_factors", "c_k"])
def test_arrays_are_symmetric_and_read_only(name: str) -> None:
    array = getattr(solve(*BASE), name)
    assert np.array_equal(array, np.swapaxes(array, 0, 1)) or np.allclose(array, np.swapaxes(array, 0, 1), rtol=1e-12)
    with pytest.raises(ValueError, match="read-only"):
        array[0, 0, 0] = 1.0
