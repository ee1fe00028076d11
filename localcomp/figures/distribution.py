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

LONGEST_NAME = 16


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
    count_in_shell, reverse_in_shell : float
        N_ij and N_ji.
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
    count_in_shell: float
    reverse_in_shell: float


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


def short(name: str) -> str:
    """A name that fits into a panel."""
    if len(name) <= LONGEST_NAME:
        return name
    half = LONGEST_NAME // 2
    return f"{name[:half]}…{name[half + 1 - LONGEST_NAME :]}"  # names that begin alike often differ at their ends


def _panel(axis: Axes, curve: PairCurve, length_label: str) -> None:
    center, neighbor = short(curve.center), short(curve.neighbor)
    axis.axvspan(curve.core, curve.shell, color=SHELL, zorder=0)
    axis.axhline(1.0, color=GRID, lw=0.8, zorder=1)
    (line,) = axis.plot(curve.r, curve.g, color=FOUND, lw=1.6, zorder=3, label="g(r), left scale")
    axis.set_ylim(0.0, 1.1 * float(curve.g.max()))
    axis.set_xlim(0.0, float(curve.r[-1]))
    axis.set_xlabel(f"r / {length_label}")
    axis.set_ylabel("g(r)", color=FOUND)
    right = axis.twinx()
    right.spines["right"].set_visible(True)
    counts = [(f"{neighbor} within r of {center}", curve.count, curve.count_in_shell, COUNT, "--")]
    if curve.reverse_count is not None:
        label = f"{center} within r of {neighbor}"
        counts.append((label, curve.reverse_count, curve.reverse_in_shell, SECOND, ":"))
    handles = [line]
    for n, (label, values, in_shell, color, dash) in enumerate(counts):
        (count_line,) = right.plot(curve.radii, values, color=color, lw=1.4, ls=dash, label=label)
        handles.append(count_line)
        right.plot([curve.shell], [in_shell], "o", ms=4, color=color)
        if in_shell > 0.0 and (n == 0 or abs(in_shell - counts[0][2]) > 0.005):
            upper = n == 0 and len(counts) > 1 and in_shell > counts[1][2]
            right.annotate(
                f"{in_shell:.2f}",
                (curve.shell, in_shell),
                xytext=(-6, 5) if upper else (7, -10),
                ha="right" if upper else "left",
                textcoords="offset points",
                color=color,
                fontsize=8,
                bbox={"boxstyle": "square,pad=0.1", "facecolor": "white", "edgecolor": "none", "alpha": 0.8},
                zorder=5,
            )
    right.set_ylim(0.0, 2.6 * max(item[2] for item in counts) or 1.0)
    right.set_ylabel("neighbours within r")
    axis.set_title(f"{center} - {neighbor}", pad=44)
    axis.legend(
        handles, [str(h.get_label()) for h in handles], loc="lower left", bbox_to_anchor=(0.0, 1.0), ncols=1,
        handlelength=2.6, borderaxespad=0.2, labelspacing=0.25,
    )  # fmt: skip
    axis.text(
        0.5 * (curve.core + curve.shell), 0.03, "shell", transform=axis.get_xaxis_transform(), ha="center",
        fontsize=7.5, color=INK,
    )  # fmt: skip
