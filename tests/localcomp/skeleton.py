"""Classes of states without numbers, to be filled with a model's own neighbours."""

from __future__ import annotations

import itertools

import numpy as np

from localcomp.evidence import Findings, Table

CLASSES: dict[str, tuple[tuple[float, ...], tuple[float, ...], float, tuple[float, ...]]] = {
    "equal sizes, unlike energies": ((1.0, 1.0, 1.0), (1.0, 4.0, 2.0), 0.05, (0.5, 1.0)),
    "unlike sizes, weak unlike contacts": ((1.0, 1.5, 2.0), (1.0, 1.0, 1.0), 0.35, (0.2, 0.4)),
    "unlike sizes and energies": ((1.0, 1.6, 1.3), (1.0, 4.0, 2.5), -0.2, (0.5, 1.0)),
    "mild": ((1.0, 1.25, 1.1), (1.0, 1.3, 1.2), 0.05, (1.0, 2.0)),
}
"""Diameters, depths, k and temperatures; the first two species are the pair."""

COMPOSITIONS = (0.0, 0.1, 0.3, 0.5, 0.7, 0.9, 1.0)
PACKING = (0.3, 0.4)
TERNARY = ((0.2, 0.3, 0.5), (0.6, 0.2, 0.2))


def skeleton(name: str) -> Findings:
    """A class of states; counts are ones."""
    sizes, energies, k, temperatures = CLASSES[name]
    return Findings(
        main=_table(sizes[:2], energies[:2], k, temperatures, [(x, 1.0 - x) for x in COMPOSITIONS]),
        athermal=np.ones((len(temperatures) * len(PACKING) * len(COMPOSITIONS), 2, 2)),
        rules={"another rule": np.ones((len(temperatures) * len(PACKING) * len(COMPOSITIONS), 2, 2))},
        ternary=_table(sizes, energies, k, temperatures, list(TERNARY)),
        binary=np.zeros((len(temperatures) * len(PACKING) * len(TERNARY), 3, 3)),
    )


def _table(
    sizes: tuple[float, ...], energies: tuple[float, ...], k: float, temperatures: tuple[float, ...],
    compositions: list[tuple[float, ...]],
) -> Table:  # fmt: skip
    sigma, eps = np.array(sizes), np.array(energies)
    diameter = 0.5 * (sigma[:, None] + sigma[None, :])
    depth = np.sqrt(eps[:, None] * eps[None, :]) * (1.0 - k * (1.0 - np.eye(len(eps))))
    grid = list(itertools.product(PACKING, compositions, temperatures))
    n, s = len(grid), len(sizes)
    ones = np.ones((n, s, s))
    return Table(
        np.zeros(n, int),
        np.array([x for _, x, _ in grid]),
        np.array([t for _, _, t in grid]),
        np.array([p for p, _, _ in grid]),
        np.broadcast_to(depth, (n, s, s)),
        np.broadcast_to(diameter, (n, s, s)),
        ones,
        ones,
        np.zeros((n, s, s)),
        tuple({"reduced_temperature": t} for _, _, t in grid),
    )
