"""A full isotherm of ln gamma against solving its states one by one without warm starts, in one run.

Run with `pytest tests/benchmarks -s`; not collected by default.
"""

from __future__ import annotations

import time

import numpy as np
import pytest

from localcomp.activity import DEGREES, activity_at_packing
from localcomp.activity_parts import mole_fractions_of
from localcomp.betapath import ACCURACY_SHARE, BETA_POINTS, radau
from localcomp.chebyshev import chebyshev_points
from ozsolve import DEFAULT_ACCURACY, Mixture, State, solve

AT_MOST_SECONDS = 0.5
AT_LEAST = 5.0
ROUNDS = 5
PAIRS = {
    "equal sizes": (Mixture([1.0, 1.0], [1.0, 1.5], k=0.1), 1.8),
    "size ratio 1.2": (Mixture([1.0, 1.2], [1.0, 1.2], k=0.1), 1.7),
    "size ratio 1.5": (Mixture([1.0, 1.5], [1.0, 1.5], k=0.1), 2.0),
}


@pytest.mark.parametrize("name", list(PAIRS))
def test_isotherm(name: str, capsys: pytest.CaptureFixture[str]) -> None:
    mixture, temperature = PAIRS[name]
    first = np.arange(11) / 10
    listed = np.stack((first, 1.0 - first), axis=1)
    s = chebyshev_points(DEGREES[0])
    rows = mole_fractions_of(mixture.diameter, np.stack((s, 1.0 - s), axis=1))
    states = [
        State(temperature / float(b), tuple(x), packing_fraction=0.4) for x in rows for b in radau(BETA_POINTS)[0]
    ]
    whole, single = [], []
    for _ in range(ROUNDS):
        began = time.perf_counter()
        activity_at_packing(mixture, temperature, 0.4, listed)
        whole.append(time.perf_counter() - began)
        began = time.perf_counter()
        for state in states:
            solve(mixture, state, accuracy=ACCURACY_SHARE * DEFAULT_ACCURACY)
        single.append(time.perf_counter() - began)
    ratio = min(single) / min(whole)
    with capsys.disabled():
        print(f"\n{name}: isotherm {min(whole):.3f} s, its {len(states)} states one by one {min(single):.3f} s: "
              f"{ratio:.2f} times faster")  # fmt: skip
    assert min(whole) < AT_MOST_SECONDS
    assert ratio > AT_LEAST
