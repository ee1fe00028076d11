"""Fits: ln gamma true, fitted and unfitted; neighbour ratios and energies that the fits imply."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from numpy.typing import NDArray

from localcomp.figures.ratios import called, plain_log
from localcomp.figures.style import DASHES, GRID, INK, LINES, look

Array = NDArray[np.float64]

NOTE = "spheres with square wells; verify against measured phase equilibria"


@dataclass(frozen=True)
class FitPanel:
    """ln gamma of one pair at one temperature under one model.

    Attributes
    ----------
    title : str
    x : ndarray, shape (m,)
    truth : ndarray, shape (m, 2)
    fine : ndarray, shape (p,)
    fitted : ndarray, shape (p, 2)
    unfitted : sequence of (str, ndarray of shape (p, 2))
    """

    title: str
    x: Array
    truth: Array
    fine: Array
    fitted: Array
    unfitted: Sequence[tuple[str, Array]]


def fit_figure(panels: Sequence[FitPanel], heading: str, names: tuple[str, str]) -> Figure:
    """One panel per model; colours are species, dashes the kind of curve."""
    columns = min(4, len(panels))
    rows = -(-len(panels) // columns)
    with look():
        figure = Figure(figsize=(max(2.7 * columns, 6.0), 2.4 * rows + 1.3), layout="constrained")
        axes = figure.subplots(rows, columns, squeeze=False, sharex=True, sharey=True).ravel()
        true = np.concatenate([p.truth.ravel() for p in panels])
        true = true[np.isfinite(true)]
        span = max(float(np.ptp(true)), 0.05) if true.size else 1.0
        low, high = (float(true.min()), float(true.max())) if true.size else (0.0, 1.0)
        handles: list[Line2D] = []
        for axis, panel in zip(axes, panels, strict=False):
            handles = []
            axis.axhline(0.0, color=GRID, lw=0.8, zorder=0)
            for s, name in enumerate(names):
                color = LINES[s]
                handles += axis.plot(panel.x, panel.truth[:, s], ls="", marker="os"[s], ms=4.5, color=color,
                                     label=f"true, {called(name)}")  # fmt: skip
                handles += axis.plot(
                    panel.fine, panel.fitted[:, s], lw=1.5, color=color, label=f"fitted, {called(name)}"
                )
                for n, (label, values) in enumerate(panel.unfitted):
                    handles += axis.plot(panel.fine, values[:, s], lw=1.1, ls=DASHES[1 + n], color=color,
                                         label=f"true energies, {label}, {called(name)}")  # fmt: skip
            axis.set_title(panel.title)
            axis.set_xlim(-0.03, 1.03)
            axis.set_ylim(low - 0.35 * span, high + 0.35 * span)
        for n, axis in enumerate(axes):
            if n >= len(panels):
                axis.set_visible(False)
            elif n + columns >= len(panels):
                axis.set_xlabel(f"mole fraction of {called(names[0])}")
                axis.tick_params(labelbottom=True)
            if n % columns == 0:
                axis.set_ylabel("ln γ")
        figure.legend(handles, [str(h.get_label()) for h in handles], loc="outside lower center", ncols=2,
                      handlelength=3.0, title=NOTE, title_fontsize=8.0)  # fmt: skip
        figure.suptitle(heading, fontsize=10)
    return figure


@dataclass(frozen=True)
class Cloud:
    """Points of one model."""

    label: str
    x: Array
    y: Array


def ratio_parity(clouds: Sequence[Cloud], limit: float, heading: str) -> Figure:
    """Neighbour ratios implied by fitted energies against the true ones, logarithmic, one panel per model."""
    columns = min(4, len(clouds))
    rows = -(-len(clouds) // columns)
    with look():
        figure = Figure(figsize=(max(2.5 * columns, 6.0), 2.5 * rows + 0.8), layout="constrained")
        axes = figure.subplots(rows, columns, squeeze=False, sharex=True, sharey=True).ravel()
        true = np.concatenate([c.x[np.isfinite(c.x)] for c in clouds])
        low, high = (0.8 * float(true.min()), 1.25 * float(true.max())) if true.size else (0.5, 2.0)
        line = np.array([low, high])
        for axis, cloud in zip(axes, clouds, strict=False):
            axis.fill_between(line, line * np.exp(-limit), line * np.exp(limit), color=GRID, alpha=0.6, lw=0)
            axis.plot(line, line, color=INK, lw=0.8)
            inside = np.clip(cloud.y, 0.5 * low, 2.0 * high)
            axis.plot(cloud.x, inside, ls="", marker="o", ms=2.6, mew=0, alpha=0.6, color=LINES[0])
            axis.set_xscale("log")
            axis.set_yscale("log")
            axis.set_xlim(low, high)
            axis.set_ylim(0.5 * low, 2.0 * high)
            axis.set_title(cloud.label)
            for which in (axis.xaxis, axis.yaxis):
                plain_log(which, 4)
        for n, axis in enumerate(axes):
            if n >= len(clouds):
                axis.set_visible(False)
            elif n + columns >= len(clouds):
                axis.set_xlabel("true R")
                axis.tick_params(labelbottom=True)
            if n % columns == 0:
                axis.set_ylabel("R implied by the fit")
        band = 100 * (np.exp(limit) - 1.0)
        figure.suptitle(f"{heading}\ngrey: within {band:.0f} %; points beyond the frame at its edge", fontsize=10)
    return figure


def energy_figure(clouds: Sequence[Cloud], heading: str, unit: str, z: float) -> Figure:
    """Fitted energies against those of one contact, one panel per model; lines for one and for z/2 contacts."""
    columns = min(4, len(clouds))
    rows = -(-len(clouds) // columns)
    with look():
        figure = Figure(figsize=(max(2.5 * columns, 6.0), 2.3 * rows + 1.1), layout="constrained")
        axes = figure.subplots(rows, columns, squeeze=False, sharex=True, sharey=True).ravel()
        x, y = (np.concatenate([getattr(c, name) for c in clouds]) for name in "xy")
        reach = 1.1 * float(np.max(np.abs(x[np.isfinite(x)]), initial=0.1))
        height = 1.15 * float(np.max(np.abs(y[np.isfinite(y)]), initial=reach))
        line = np.array([-reach, reach])
        handles: list[Line2D] = []
        for axis, cloud in zip(axes, clouds, strict=False):
            handles = [
                *axis.plot(
                    cloud.x, cloud.y, ls="", marker="o", ms=3.4, mew=0, alpha=0.7, color=LINES[0], label="pairs"
                ),
                *axis.plot(line, line, color=INK, lw=0.9, label="one contact (m = 1)"),
                *axis.plot(
                    line, z / 2.0 * line, color=INK, lw=0.9, ls=":", label=f"z/2 = {z / 2.0:g} contacts (m = z/2)"
                ),
            ]
            axis.axhline(0.0, color=GRID, lw=0.8, zorder=0)
            axis.axvline(0.0, color=GRID, lw=0.8, zorder=0)
            axis.set_xlim(-reach, reach)
            axis.set_ylim(-height, height)
            axis.set_title(cloud.label)
        for n, axis in enumerate(axes):
            if n >= len(clouds):
                axis.set_visible(False)
            elif n + columns >= len(clouds):
                axis.set_xlabel(f"true, {unit}")
                axis.tick_params(labelbottom=True)
            if n % columns == 0:
                axis.set_ylabel(f"fitted, {unit}")
        figure.legend(handles, [str(h.get_label()) for h in handles], loc="outside lower center", ncols=3)
        figure.suptitle(heading, fontsize=10)
    return figure
