"""Maps of the measured Boltzmann multiplicity over size and energy ratio."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from matplotlib import colormaps
from matplotlib.colors import TwoSlopeNorm
from matplotlib.figure import Figure
from numpy.typing import NDArray

from localcomp.figures.ratios import Curve, called
from localcomp.figures.style import DASHES, GRID, INK, LINES, fit, look

Array = NDArray[np.float64]

LEAST_RANGE = 0.2
"""Of a multiplicity axis: less than that is no difference worth seeing."""


@dataclass(frozen=True)
class MultiplicityMap:
    """m of one pair direction.

    Attributes
    ----------
    title : str
    columns, rows : ndarray
        Size ratios and energy ratios.
    values : ndarray, shape (rows, columns)
        NaN where energies do not differ or nothing was solved.
    """

    title: str
    columns: Array
    rows: Array
    values: Array


def multiplicity_maps(maps: Sequence[MultiplicityMap], heading: str) -> Figure:
    """One panel per pair direction; every cell carries its number, blank cells have no energy difference."""
    across = min(2, len(maps))
    down = -(-len(maps) // across)
    width = max(1.6 + 0.62 * max(len(m.columns) for m in maps), 3.3) * across + 1.0
    height = (max(0.42 * max(len(m.rows) for m in maps), 1.3) + 0.9) * down + 0.6
    with look():
        figure = Figure(figsize=(width, height), layout="constrained")
        axes = figure.subplots(down, across, squeeze=False).ravel()
        found = np.concatenate([m.values[np.isfinite(m.values)] for m in maps])
        low, high = (float(found.min()), float(found.max())) if found.size else (0.0, 1.0)
        norm = TwoSlopeNorm(1.0, min(low, 0.0) - 1e-6, max(high, 2.0) + 1e-6)
        image = None
        for axis, part in zip(axes, maps, strict=False):
            axis.set_facecolor(GRID)
            image = axis.imshow(
                np.ma.masked_invalid(part.values), origin="lower", aspect="auto", cmap=colormaps["PuOr"], norm=norm
            )
            for n in range(len(part.rows)):
                for m in range(len(part.columns)):
                    value = part.values[n, m]
                    if np.isfinite(value):
                        shade = abs(float(norm(value)) - 0.5)
                        axis.text(m, n, f"{value:.2f}", ha="center", va="center", fontsize=8,
                                  color="white" if shade > 0.36 else INK)  # fmt: skip
            axis.set_xticks(range(len(part.columns)), [f"{v:g}" for v in part.columns])
            axis.set_yticks(range(len(part.rows)), [f"{v:g}" for v in part.rows])
            axis.set_xlabel("size ratio σ_2/σ_1")
            axis.set_ylabel("energy ratio ε_2/ε_1")
            axis.set_title(part.title)
        if image is not None:
            figure.colorbar(image, ax=list(axes), label="multiplicity m", shrink=0.95)
        figure.suptitle(f"{heading}\ngrey: the energies do not differ, or no solution", fontsize=10)
    return figure


def multiplicity_lines(curves: Sequence[Curve], heading: str, species: str) -> Figure:
    """m against composition, for a single pair."""
    with look():
        figure = Figure(figsize=(7.0, 4.2), layout="constrained")
        axis = figure.subplots()
        axis.axhline(1.0, color=GRID, lw=0.8, zorder=0)
        for n, curve in enumerate(curves):
            axis.plot(curve.x, curve.y, marker="o", ms=4, lw=1.3, color=LINES[n % len(LINES)],
                      ls=DASHES[n % len(DASHES)], label=curve.label)  # fmt: skip
        axis.set_xlim(-0.03, 1.03)
        axis.margins(y=0.15)
        low, high = axis.get_ylim()
        if high - low < LEAST_RANGE:
            axis.set_ylim(0.5 * (low + high - LEAST_RANGE), 0.5 * (low + high + LEAST_RANGE))
        axis.set_xlabel(f"mole fraction of {called(species)}")
        axis.set_ylabel("multiplicity m, dimensionless")
        figure.legend(*axis.get_legend_handles_labels(), loc="outside right upper")
        fit(figure, axis.set_title(heading, fontsize=10, loc="left"), axis)
    return figure
