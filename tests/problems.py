"""Shared problems: (name, mixture, state). Every solver method meets every one."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ozsolve import CLOSURES, Mixture, PairOverride, State

PROBLEMS = {
    "one component": (Mixture(1.0, 1.0), State(1.5, packing_fraction=0.40)),
    "equal sizes": (Mixture([1.0, 1.0], [1.0, 2.0]), State(1.5, (0.3, 0.7), packing_fraction=0.40)),
    "unlike": (Mixture([1.0, 1.5], [1.0, 1.5], k=0.1), State(2.0, (0.5, 0.5), packing_fraction=0.40)),
    "ternary": (Mixture([1.0, 1.2, 1.6], [1.0, 0.8, 1.4]), State(2.0, (0.2, 0.3, 0.5), packing_fraction=0.38)),
    "shoulder": (
        Mixture([1.0, 1.3], [1.0, -0.5], overrides=[PairOverride(0, 1, well_depth=0.4)]),
        State(1.5, (0.6, 0.4), packing_fraction=0.35),
    ),
    "hard": (Mixture([1.0, 2.0], [0.0, 0.0]), State(1.0, (0.9, 0.1), packing_fraction=0.40)),
    "non-additive": (Mixture([1.0, 1.4], [1.0, 1.0], l=0.05), State(2.0, (0.5, 0.5), packing_fraction=0.35)),
}


def random_states(count: int, seed: int) -> Iterator[tuple[Mixture, State, str]]:
    """Anything the door lets in: gases to dense and very cold fluids, one to four species, absent ones, shoulders."""
    rng = np.random.default_rng(seed)
    names = list(CLOSURES)
    for n in range(count):
        species = int(rng.integers(1, 5))
        sigma = np.concatenate(([1.0], rng.uniform(1.0, 4.0, species - 1)))
        depth = rng.uniform(0.0, 2.0, species) * (-1.0 if rng.random() < 0.25 else 1.0)
        x = rng.dirichlet(np.ones(species))
        if species > 1 and rng.random() < 0.3:
            x[0] = 0.0
        mixture = Mixture(sigma, depth, rng.uniform(1.05, 2.2), k=float(rng.uniform(-0.4, 0.4)))
        temperature, eta = float(np.exp(rng.uniform(np.log(0.15), np.log(4.0)))), float(rng.uniform(0.005, 0.54))
        yield mixture, State(temperature, tuple(x / x.sum()), packing_fraction=eta), names[n % len(names)]


def random_liquids(count: int, seed: int) -> Iterator[tuple[Mixture, State, str]]:
    """Two to three species, eta 0.2-0.45, size ratio up to 2, all closures in turn."""
    rng = np.random.default_rng(seed)
    names = list(CLOSURES)
    for n in range(count):
        species = int(rng.integers(2, 4))
        sigma = np.concatenate(([1.0], rng.uniform(1.0, 2.0, species - 1)))
        depth = rng.uniform(0.5, 1.5, species)
        x = rng.dirichlet(np.ones(species))
        mixture = Mixture(sigma, depth, rng.uniform(1.3, 1.8), k=float(rng.uniform(-0.2, 0.2)))
        state = State(float(rng.uniform(1.2, 3.0)), tuple(x / x.sum()), packing_fraction=float(rng.uniform(0.2, 0.45)))
        yield mixture, state, names[n % len(names)]
