"""Mixtures and states: combining rules, overrides, checks at the door."""

from __future__ import annotations

import math
import pickle

import numpy as np
import pytest

from ozsolve import InputError, Mixture, PairOverride, State, solve

GOOD = {"temperature": 1.0, "mole_fractions": (0.5, 0.5), "packing_fraction": 0.4}


def test_combining_rules() -> None:
    """Lorentz (1881) and Berthelot (1898), with deviations l and k."""
    pairs = Mixture([1.0, 2.0], [1.0, 4.0], [1.5, 1.8], k=0.1, l=0.05).pairs
    assert pairs.diameter[0, 1] == pytest.approx(0.95 * 1.5)
    assert pairs.well_depth[0, 1] == pytest.approx(0.9 * 2.0)
    assert pairs.well_edge[0, 1] == pytest.approx(0.95 * (1.5 + 3.6) / 2.0)
    assert Mixture([1.0, 2.0], [1.0, 4.0], 1.5).pairs.well_range[0, 1] == pytest.approx(1.5)


def test_overrides_and_shoulders() -> None:
    both = Mixture([1.0, 1.0], [-1.0, -4.0])
    assert both.pairs.well_depth[0, 1] == pytest.approx(-2.0)
    given = Mixture([1.0, 1.0], [1.0, -1.0], overrides=[PairOverride(0, 1, 1.1, 0.3, 1.4)])
    assert given.pairs.well_depth[1, 0] == 0.3
    assert given.pairs.diameter[0, 1] == 1.1
    assert given.pairs.well_edge[0, 1] == pytest.approx(1.54)
    with pytest.raises(InputError, match="no geometric mean"):
        Mixture([1.0, 1.0], [1.0, -1.0])


BAD_MIXTURES = [
    (([1.0, -1.0], [1.0, 1.0]), {}, "diameter"),
    (([1.0, 0.0], [1.0, 1.0]), {}, "diameter"),
    (([1.0, math.nan], [1.0, 1.0]), {}, "diameter"),
    (([1.0, 30.0], [1.0, 1.0]), {}, "diameter"),
    (([1.0, 1.0], [1.0, math.inf]), {}, "well_depth"),
    (([1.0, 1.0], [1.0, 1.0, 1.0]), {}, "well_depth"),
    (([1.0, 1.0], ["a", 1.0]), {}, "well_depth"),
    (([1.0, 1.0], [1.0, 1.0]), {"well_range": 1.0}, "well_range"),
    (([1.0, 1.0], [1.0, 1.0]), {"k": [[0.0, 0.1], [0.2, 0.0]]}, "k"),
    (([1.0, 1.0], [1.0, 1.0]), {"k": [[0.1, 0.1], [0.1, 0.0]]}, "k"),
    (([1.0, 1.0], [1.0, 1.0]), {"l": [0.1]}, "l"),
    (([1.0, 1.0], [1.0, 1.0]), {"l": 1.5}, "diameter of pair"),
    (([1.0, 1.0], [1.0, 1.0]), {"names": ["a", "a"]}, "names"),
    (([1.0, 1.0], [1.0, 1.0]), {"overrides": [PairOverride(0, 2)]}, "pair"),
    (([1.0, 1.0], [1.0, 1.0]), {"overrides": [PairOverride(0, 1, well_range=0.9)]}, "well_range of pair"),
    (([1.0, 1.0], [1.0, 1.0]), {"overrides": [PairOverride(0, 1, diameter=math.nan)]}, "diameter of pair"),
]


@pytest.mark.parametrize(("args", "more", "field"), BAD_MIXTURES)
def test_bad_mixtures_are_refused(args, more, field: str) -> None:
    with pytest.raises(InputError) as caught:
        Mixture(*args, **more)
    assert caught.value.field.startswith(field)
    assert caught.value.allowed


@pytest.mark.parametrize(
    ("changes", "field"),
    [
        ({"temperature": 0.0}, "temperature"),
        ({"temperature": -1.0}, "temperature"),
        ({"temperature": math.nan}, "temperature"),
        ({"temperature": True}, "temperature"),
        ({"mole_fractions": (0.5, 0.6)}, "mole_fractions"),
        ({"mole_fractions": (1.5, -0.5)}, "mole_fractions"),
        ({"packing_fraction": 0.0}, "packing_fraction"),
        ({"packing_fraction": 0.55}, "packing_fraction"),
        ({"packing_fraction": None}, "packing_fraction, density"),
        ({"density": 0.5}, "packing_fraction, density"),
        ({"packing_fraction": None, "density": -1.0}, "density"),
    ],
)
def test_bad_states_are_refused(changes, field: str) -> None:
    with pytest.raises(InputError) as caught:
        State(**{**GOOD, **changes})
    assert caught.value.field == field


def test_solve_refuses_what_it_does_not_know() -> None:
    mixture, state = Mixture(1.0, 1.0), State(1.5, packing_fraction=0.4)
    for wrong in ({"closure": "pyy"}, {"accuracy": 0.0}, {"accuracy": math.nan}, {"on_failure": "ignore"}):
        with pytest.raises(InputError):
            solve(mixture, state, **wrong)
    with pytest.raises(TypeError):
        solve(mixture, state, closures="py")  # type: ignore[call-arg]
    with pytest.raises(InputError, match="one per species"):
        solve(mixture, State(1.5, (0.5, 0.5), packing_fraction=0.4))


def test_mixtures_are_immutable_and_travel() -> None:
    mixture = Mixture([1.0, 1.5], [1.0, 1.0], k=0.1, names=["a", "b"])
    with pytest.raises(AttributeError):
        mixture.names = ("x", "y")
    with pytest.raises(ValueError, match="read-only"):
        mixture.pairs.diameter[0, 0] = 2.0
    copy = pickle.loads(pickle.dumps(mixture))
    assert copy.names == mixture.names
    assert np.array_equal(copy.pairs.well_depth, mixture.pairs.well_depth)


def test_density_and_packing_fraction_agree() -> None:
    mixture = Mixture([1.0, 1.5], [1.0, 1.0])
    state = State(1.0, (0.3, 0.7), packing_fraction=0.37)
    rho = mixture.densities(state)
    assert math.pi / 6 * float(rho @ mixture.diameter**3) == pytest.approx(0.37)
    again = State(1.0, (0.3, 0.7), density=float(rho.sum()))
    assert mixture.packing_fraction(again) == pytest.approx(0.37)
    with pytest.raises(InputError, match="packing fraction"):
        mixture.densities(State(1.0, (0.3, 0.7), density=2.0))
