"""Neighbour ratios against composition, reciprocity, and the Boltzmann plot, with what models state drawn over."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.axis import XAxis, YAxis
from matplotlib.figure import Figure
from matplotlib.ticker import FuncFormatter, MaxNLocator, NullFormatter
from numpy.typing import NDArray

from localcomp.figures.style import DASHES, FOUND, GRID, INK, LINES, SECOND, fit, look

Array = NDArray[np.float64]

HEADROOM = 1.6
"""How far beyond what was found, as a factor, a panel reaches; lines that leave it are cut off."""


def called(name: str) -> str:
    """A species in an axis label; a bare number is not a name."""
    return f"species {name}" if name.isdigit() else name


@dataclass(frozen=True)
class Curve:
    """A line with a label."""

    label: str
    x: Array
    y: Array


@dataclass(frozen=True)
class RatioPanel:
    """One pair direction at one temperature.

    Attributes
    ----------
    title, ylabel : str
    x, found, error : ndarray, shape (m,)
        Mole fraction, R found, its uncertainty (relative).
    stated : sequence of Curve
        The same labels in every panel.
    """

    title: str
    ylabel: str
    x: Array
    found: Array
    error: Array
    stated: Sequence[Curve]


def ratio_figure(
    panels: Sequence[Sequence[RatioPanel]], heading: str, species: str, missing: Sequence[str] = ()
) -> Figure:
    """Rows: pair directions; columns: temperatures. R on a logarithmic scale; `missing` names models not drawn."""
    note = "lines not seen lie outside the panels" + (f"; not drawn: {', '.join(missing)}" if missing else "")
    rows, columns = len(panels), len(panels[0])
    labels = [curve.label for curve in panels[0][0].stated]
    with look():
        figure = Figure(
            figsize=(max(3.1 * columns + 0.4, 6.6), 2.75 * rows + 0.6 + 0.19 * len(labels)), layout="constrained"
        )
        axes = figure.subplots(rows, columns, squeeze=False, sharex=True, sharey="row")
        handles = []
        for row, line in enumerate(panels):
            low = min(float(np.nanmin(p.found)) for p in line) / HEADROOM
            high = max(float(np.nanmax(p.found)) for p in line) * HEADROOM
            for column, panel in enumerate(line):
                handles = _ratio_panel(axes[row, column], panel, min(low, 1 / HEADROOM), max(high, HEADROOM))
                axes[row, column].set_title(panel.title)
                if column == 0:
                    axes[row, column].set_ylabel(panel.ylabel)
                if row == rows - 1:
                    axes[row, column].set_xlabel(f"mole fraction of {called(species)}")
        figure.legend(
            handles,
            [str(h.get_label()) for h in handles],
            loc="outside lower center",
            ncols=2,
            handlelength=3.2,
            title=note,
            title_fontsize=8.0,
        )
        figure.suptitle(heading, fontsize=10)
    return figure


def _ratio_panel(axis: Axes, panel: RatioPanel, low: float, high: float) -> list:  # type: ignore[type-arg]
    axis.axhline(1.0, color=GRID, lw=0.8, zorder=0)
    handles = []
    for n, curve in enumerate(panel.stated):
        (line,) = axis.plot(
            curve.x, curve.y, lw=1.4, color=LINES[n % len(LINES)], ls=DASHES[n % len(DASHES)],
            label=curve.label,
        )  # fmt: skip
        handles.append(line)
    bars = axis.errorbar(
        panel.x, panel.found, panel.error * panel.found, ls="", marker="o", ms=5, color=INK, capsize=2, lw=1.0,
        label="found (bar: numerical and closure uncertainty)", zorder=5,
    )  # fmt: skip
    axis.set_yscale("log")
    axis.set_ylim(low, high)
    axis.set_xlim(-0.03, 1.03)
    plain_log(axis.yaxis)
    return [bars, *handles]


def plain_log(axis: XAxis | YAxis, most: int = 8) -> None:
    """Plain numbers on a logarithmic axis that spans less than two decades."""
    low, high = axis.get_view_interval()
    for choices in (TICKS, TICKS[::2], (0.1, 0.3, 1.0, 3.0, 10.0)):
        ticks = [tick for tick in choices if low <= tick <= high]
        if len(ticks) <= most:
            break
    if len(ticks) < 2:  # a narrow axis
        ticks = [tick for tick in MaxNLocator(most - 1).tick_values(low, high) if low <= tick <= high]
    axis.set_ticks(ticks)
    axis.set_major_formatter(FuncFormatter(lambda v, _: f"{v:g}"))
    axis.set_minor_formatter(NullFormatter())


TICKS = (0.1, 0.2, 0.3, 0.5, 0.7, 1.0, 1.5, 2.0, 3.0, 5.0, 7.0, 10.0, 20.0, 50.0)


@dataclass(frozen=True)
class SlopeTable:
    """The Boltzmann plot.

    Attributes
    ----------
    exchange, change : ndarray, shape (k,)
        D_ij = beta (eps_ij - eps_ii) and ln R - ln R(athermal).
    group : sequence of str
        A label per point.
    slopes : sequence of (str, float)
        Claimed slopes.
    """

    exchange: Array
    change: Array
    group: Sequence[str]
    slopes: Sequence[tuple[str, float]]


def slope_figure(table: SlopeTable, heading: str) -> Figure:
    """ln R without its athermal part against beta (eps_ij - eps_ii), with the claimed slopes."""
    with look():
        figure = Figure(figsize=(7.2, 4.8), layout="constrained")
        axis = figure.subplots()
        reach = 1.05 * float(np.max(np.abs(table.exchange), initial=0.1))
        height = 1.35 * float(np.max(np.abs(table.change), initial=0.05))
        line = np.array([-reach, reach])
        for n, (label, slope) in enumerate(table.slopes):
            axis.plot(
                line, slope * line, color=LINES[n % len(LINES)], lw=1.3, ls=DASHES[n % len(DASHES)],
                label=f"slope {slope:.3g}: {label}",
            )  # fmt: skip
        marks = "os^vDP"
        colors = (FOUND, SECOND, INK)
        groups = list(dict.fromkeys(table.group))
        names = np.array(table.group)
        for n, name in enumerate(groups):
            chosen = names == name
            axis.plot(
                table.exchange[chosen], table.change[chosen], ls="", marker=marks[n % len(marks)], ms=3.2,
                color=colors[n % len(colors)], alpha=0.55, mew=0, label=f"found, {name}",
            )  # fmt: skip
        axis.set_xlim(-reach, reach)
        axis.set_ylim(-height, height)
        axis.axhline(0.0, color=GRID, lw=0.8, zorder=0)
        axis.axvline(0.0, color=GRID, lw=0.8, zorder=0)
        axis.set_xlabel("β (ε_ij − ε_ii), dimensionless")
        axis.set_ylabel("ln R_ij − ln R_ij (athermal), dimensionless")
        figure.legend(*axis.get_legend_handles_labels(), loc="outside right upper", markerscale=1.8)
        axis.locator_params(axis="x", nbins=7)
        fit(figure, axis.set_title(heading, fontsize=10, loc="left"), axis)
    return figure


def reciprocity_figure(
    curves: Sequence[Curve], found: Curve, heading: str, pair: tuple[str, str], species: str
) -> Figure:
    """x_i N_ij/(x_j N_ji) that each model implies; real pairs give one."""
    with look():
        figure = Figure(figsize=(7.2, 3.6 + 0.1 * len(curves)), layout="constrained")
        axis = figure.subplots()
        for n, curve in enumerate(curves):
            axis.plot(
                curve.x, curve.y, lw=1.4, color=LINES[n % len(LINES)],
                ls=DASHES[n % len(DASHES)], label=curve.label,
            )  # fmt: skip
        axis.plot(found.x, found.y, ls="", marker="o", ms=5, color=INK, label=found.label, zorder=5)
        axis.set_yscale("log")
        values = np.concatenate([curve.y for curve in curves] or [np.ones(1)])
        values = values[np.isfinite(values)]
        low, high = (float(values.min()), float(values.max())) if values.size else (1.0, 1.0)
        axis.set_ylim(min(low / 1.15, 0.8), max(high * 1.15, 1.25))
        plain_log(axis.yaxis)
        axis.set_xlim(-0.03, 1.03)
        axis.set_xlabel(f"mole fraction of {called(species)}")
        i, j = pair
        axis.set_ylabel(f"pairs counted from {i} / pairs counted from {j}")
        figure.legend(*axis.get_legend_handles_labels(), loc="outside right upper", handlelength=3.2)
        fit(figure, axis.yaxis.label, axis)
        fit(figure, axis.set_title(heading, fontsize=10, loc="left"), axis)
    return figure
