"""Tables behind the figures of one state."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from localcomp.figures.distribution import PairCurve
from localcomp.report import StateReport

Array = NDArray[np.float64]

POINTS = 220
REACH = 3.2
"""How far a panel shows, in the largest diameter."""


def pair_curves(report: StateReport) -> list[PairCurve]:
    """One curve per pair i <= j of a usable report."""
    assert report.neighbors is not None
    solution, mixture = report.solution, report.request.mixture
    reach = REACH * float(mixture.diameter.max())
    radii = np.linspace(0.0, reach, POINTS)
    running = solution.running_shell_integral(radii[1:])
    rho = solution.densities
    curves = []
    for i, center in enumerate(mixture.names):
        for j in range(i, mixture.species):
            counts = np.concatenate(([0.0], running[i, j]))
            r, g = _with_jumps(report, i, j, reach)
            curves.append(
                PairCurve(
                    center=center,
                    neighbor=mixture.names[j],
                    r=r,
                    g=g,
                    radii=radii,
                    count=rho[j] * counts,
                    reverse_count=None if i == j else rho[i] * counts,
                    core=float(mixture.pairs.diameter[i, j]),
                    shell=float(report.neighbors.radius[i, j]),
                    count_in_shell=float(report.neighbors.coordination_numbers[i, j]),
                    reverse_in_shell=float(report.neighbors.coordination_numbers[j, i]),
                )
            )
    return curves


def _with_jumps(report: StateReport, i: int, j: int, reach: float) -> tuple[Array, Array]:
    """g with both values at contact and at the well edge, in order of r."""
    solution = report.solution
    core = float(report.request.mixture.pairs.diameter[i, j])
    edge = float(report.request.mixture.pairs.well_edge[i, j])
    inside, outside = (float(table[i, j]) for table in solution.edge_values)
    r, g = solution.r, solution.g_r[i, j]
    well = (r > core) & (r < edge)
    beyond = (r > edge) & (r < reach)
    radii = np.concatenate(([0.0, core, core], r[well], [edge, edge], r[beyond]))
    contact = float(solution.contact_values[i, j])
    values = np.concatenate(([0.0, 0.0, contact], g[well], [inside, outside], g[beyond]))
    return radii, values
