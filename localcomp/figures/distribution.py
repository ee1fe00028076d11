"""Radial distribution functions with the shell shaded and the running coordination number."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from numpy.typing import NDArray

from localcomp.figures.style import COUNT, FOUND, GRID, INK, SECOND, SHELL, look

Array = NDArray[np.float64]


@dataclass(frozen=True)
class PairCurve:
    """One pair's panel.

    Attributes
    ----------
    center, neighbor : str
    r, g : ndarray, shape (m,)
        g with both sides of every jump, in order.
    radii, count, reverse_count : ndarray
        Running coordination numbers of neighbour around centre and, for unlike pairs, the reverse
        (None for like pairs).
    core, shell : float
        sigma_ij and the shell radius.
    """

    center: str
    neighbor: str
    r: Array
    g: Array
    radii: Array
    count: Array
    reverse_count: Array | None
    core: float
    shell: float


def distribution_figure(curves: Sequence[PairCurve], title: str, length_label: str) -> Figure:
    """One panel per pair: g left, running coordination number right."""
    columns = min(3, len(curves))
    rows = -(-len(curves) // columns)
    with look():
        figure = Figure(figsize=(max(4.2 * columns, 6.2), 3.3 * rows + 0.7), layout="constrained")
        axes = np.atleast_1d(figure.subplots(rows, columns, squeeze=False)).ravel()
        for axis, curve in zip(axes, curves, strict=False):
            _panel(axis, curve, length_label)
        for axis in axes[len(curves) :]:
            axis.set_visible(False)
        figure.suptitle(title, fontsize=10)
    return figure


def _panel(axis: Axes, curve: PairCurve, length_label: str) -> None:
    axis.axvspan(curve.core, curve.shell, color=SHELL, zorder=0)
    axis.axhline(1.0, color=GRID, lw=0.8, zorder=1)
    axis.plot(curve.r, curve.g, color=FOUND, lw=1.6, zorder=3, label="g(r)")
    top = float(curve.g.max())
    axis.set_ylim(0.0, 1.28 * top)
    axis.set_xlim(0.0, float(curve.r[-1]))
    axis.set_xlabel(f"r / {length_label}")
    axis.set_ylabel("g(r)", color=FOUND)
    axis.set_title(f"{curve.center} - {curve.neighbor}")
    right = axis.twinx()
    right.spines["right"].set_visible(True)
    counts = [(f"{curve.neighbor} around {curve.center}", curve.count, COUNT, "--")]
    if curve.reverse_count is not None:
        counts.append((f"{curve.center} around {curve.neighbor}", curve.reverse_count, SECOND, ":"))
    shell_values = []
    for label, values, color, dash in counts:
        right.plot(curve.radii, values, color=color, lw=1.3, ls=dash, label=label)
        at_shell = float(np.interp(curve.shell, curve.radii, values))
        shell_values.append(at_shell)
        right.plot([curve.shell], [at_shell], "o", ms=4, color=color)
        right.annotate(
            f"{at_shell:.2f}", (curve.shell, at_shell), xytext=(5, -9), textcoords="offset points", color=color,
            fontsize=8,
        )  # fmt: skip
    right.set_ylim(0.0, 2.6 * max(shell_values) + 1e-12)
    right.set_ylabel("neighbours within r")
    handles = [*axis.get_lines()[1:2], *right.get_lines()[::2]]
    axis.legend(handles, [str(h.get_label()) for h in handles], loc="upper right", handlelength=2.4)
    axis.text(
        0.5 * (curve.core + curve.shell), 0.03, "shell", transform=axis.get_xaxis_transform(), ha="center",
        fontsize=7.5, color=INK,
    )  # fmt: skip
