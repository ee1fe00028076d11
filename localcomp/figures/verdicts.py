"""The verdict matrix: models down, claims across; a mark and a colour for every outcome."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Rectangle

from localcomp.figures.style import GRID, INK, look

OUTCOMES = {
    "holds": ("o", "#1b7f79", "#d5ebe8", "full"),
    "strained": ("o", "#8a6d00", "#f6ecc9", "left"),
    "fails": ("X", "#9c2f2f", "#f3d6d2", "full"),
    "undecided": ("D", "#5b6770", "#e6eaec", "none"),
}
"""Marker, its colour, the cell's colour, the marker's fill: marks alone tell them apart."""


@dataclass(frozen=True)
class VerdictGrid:
    """Rows and columns of the matrix.

    Attributes
    ----------
    rows : sequence of str
        Model and reading.
    columns : sequence of str
        Claims.
    outcomes : sequence of sequence of str or None
        Per row and column; None where the model makes no such claim.
    strength : sequence of sequence of float or None
        Worst difference in tolerances.
    """

    rows: Sequence[str]
    columns: Sequence[str]
    outcomes: Sequence[Sequence[str | None]]
    strength: Sequence[Sequence[float | None]]


def verdict_figure(grid: VerdictGrid, heading: str) -> Figure:
    """Matrix with the worst difference, in tolerances, written in every cell."""
    rows, columns = len(grid.rows), len(grid.columns)
    with look():
        figure = Figure(figsize=(3.2 + 0.86 * columns, 1.75 + 0.34 * rows), layout="constrained")
        axis = figure.subplots()
        for n in range(rows):
            for m in range(columns):
                _cell(axis, m, n, grid.outcomes[n][m], grid.strength[n][m])
        axis.set_xlim(-0.5, columns - 0.5)
        axis.set_ylim(rows - 0.5, -0.5)
        axis.set_xticks(range(columns), grid.columns, rotation=35, ha="left")
        axis.xaxis.tick_top()
        axis.set_yticks(range(rows), grid.rows)
        axis.tick_params(length=0)
        for side in axis.spines.values():
            side.set_visible(False)
        handles = [
            Line2D([], [], ls="", marker=mark, ms=7, color=color, fillstyle=fill, label=name)  # type: ignore[arg-type]
            for name, (mark, color, _, fill) in OUTCOMES.items()
        ]
        handles.append(Line2D([], [], ls="", marker="_", ms=8, color=GRID, label="not claimed"))
        figure.legend(
            handles=handles, loc="outside lower center", ncols=len(handles),
            title="number: worst difference in tolerances (holds up to 1, strained up to 3)\n"
            "spheres with square wells; verify against measured phase equilibria", title_fontsize=8.0,
        )  # fmt: skip
        figure.suptitle(heading, fontsize=10)
    return figure


def _cell(axis, column: int, row: int, outcome: str | None, strength: float | None) -> None:  # type: ignore[no-untyped-def]
    if outcome is None:
        axis.plot([column], [row], marker="_", color=GRID, ms=8)
        return
    mark, color, back, fill = OUTCOMES[outcome]
    axis.add_patch(Rectangle((column - 0.47, row - 0.44), 0.94, 0.88, facecolor=back, edgecolor="none"))
    axis.plot([column - 0.24], [row], ls="", marker=mark, ms=6.5, color=color, fillstyle=fill)
    if strength is not None:
        text = f"{strength:.1f}" if strength < 100 else "> 99"
        axis.text(column + 0.4, row, text, ha="right", va="center", fontsize=7.5, color=INK)
