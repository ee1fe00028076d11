"""ln gamma against composition by both routes and all closures; bars of its parts for more species."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from numpy.typing import NDArray

from localcomp.figures.distribution import short
from localcomp.figures.style import GRID, SERIES, look

Array = NDArray[np.float64]
PART_LABELS = ("Flory-Huggins", "hard spheres", "attraction", "ln gamma")


@dataclass(frozen=True)
class SpeciesSeries:
    """One species of a binary isotherm.

    Attributes
    ----------
    name : str
    x, ln_gamma : ndarray, shape (m,)
        Listed compositions (mole fraction of the first species).
    line_x, line, kirkwood_buff : ndarray, shape (p,)
        The whole curve by the energy route and by Kirkwood-Buff.
    others : tuple of (closure, x, ln gamma)
    """

    name: str
    x: Array
    ln_gamma: Array
    line_x: Array
    line: Array
    kirkwood_buff: Array
    others: tuple[tuple[str, Array, Array], ...]


@dataclass(frozen=True)
class PanelData:
    """One isotherm: `series` for two species, `parts` of shape (4, s) for more."""

    title: str
    names: tuple[str, ...]
    series: tuple[SpeciesSeries, ...]
    parts: Array | None


def activity_figure(panels: Sequence[PanelData]) -> Figure:
    """A panel per isotherm."""
    columns = min(3, len(panels))
    rows = -(-len(panels) // columns)
    with look():
        figure = Figure(figsize=(max(4.4 * columns, 6.2), 4.0 * rows), layout="constrained")
        axes = np.atleast_1d(figure.subplots(rows, columns, squeeze=False)).ravel()
        for axis, panel in zip(axes, panels, strict=False):
            axis.set_title(panel.title)
            axis.axhline(0.0, color=GRID, lw=0.8, zorder=0)
            if panel.parts is None:
                _binary(axis, panel)
            else:
                _bars(axis, panel, panel.parts)
        for axis in axes[len(panels) :]:
            axis.set_visible(False)
    return figure


def _binary(axis: Axes, panel: PanelData) -> None:
    for series, color in zip(panel.series, SERIES, strict=False):
        name = short(series.name)
        for n, (_, x, values) in enumerate(series.others):
            label = "other closures" if n == 0 and series is panel.series[0] else None
            axis.plot(x, values, color=color, lw=0.8, alpha=0.45, label=label)
        axis.plot(series.line_x, series.kirkwood_buff, color=color, lw=1.2, ls="--", label=f"{name}, Kirkwood-Buff")
        axis.plot(series.line_x, series.line, color=color, lw=1.8, label=f"{name}, energy route")
        axis.plot(series.x, series.ln_gamma, "o", ms=3.2, color=color)
    axis.set_xlim(0.0, 1.0)
    axis.set_xlabel(f"mole fraction of {short(panel.names[0])}")
    axis.set_ylabel("ln gamma")
    axis.legend(loc="upper left", bbox_to_anchor=(0.0, -0.16), ncols=2, borderaxespad=0.0)


def _bars(axis: Axes, panel: PanelData, parts: Array) -> None:
    positions = np.arange(len(panel.names))
    width = 0.8 / len(PART_LABELS)
    for n, (label, values) in enumerate(zip(PART_LABELS, parts, strict=True)):
        axis.bar(positions + (n - 1.5) * width, np.nan_to_num(values), width, color=SERIES[n], label=label)
    axis.set_xticks(positions, [short(name) for name in panel.names])
    axis.set_ylabel("contribution to ln gamma")
    axis.legend(loc="upper left", bbox_to_anchor=(0.0, -0.1), ncols=2, borderaxespad=0.0)
