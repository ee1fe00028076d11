"""The shared look of all figures: sizes, fonts, colours that survive grey printing."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any, cast

import matplotlib
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.text import Text

INK = "#22303c"
FOUND = "#0b6e74"
COUNT = "#b3541e"
SECOND = "#6a4c93"
SHELL = "#dfe9e6"
GRID = "#c9d2d6"
SERIES = ("#0b6e74", "#b3541e", "#6a4c93", "#8a7a1f")
LINES = ("#0b6e74", "#b3541e", "#6a4c93", "#8a7a1f", "#2f5fa8", "#a23b72", "#4d4d4d")
"""Colours of lines; with `DASHES`, whose number has no factor in common, 28 combinations."""
DASHES = ("-", "--", "-.", ":")

RC: dict[str, Any] = {
    "font.size": 9.0,
    "axes.titlesize": 9.5,
    "axes.labelsize": 9.0,
    "axes.edgecolor": INK,
    "axes.labelcolor": INK,
    "text.color": INK,
    "text.parse_math": False,  # a dollar sign in a name is a dollar sign
    "xtick.color": INK,
    "ytick.color": INK,
    "axes.spines.top": False,
    "legend.frameon": False,
    "legend.fontsize": 8.0,
    "svg.hashsalt": "localcomp",
    "savefig.dpi": 150,
}

FORMATS = (".png", ".svg", ".pdf")


@contextmanager
def look() -> Iterator[None]:
    """Draw with the shared style, without touching the user's own settings."""
    with matplotlib.rc_context(cast(Any, RC)):
        yield


def fit(figure: Figure, text: Text, axis: Axes) -> None:
    """Break a heading or label into lines no longer than its axis, so that it stays clear of what lies beside it."""
    words = text.get_text()
    for _ in range(3):  # more lines leave less room for the axis
        figure.draw_without_rendering()
        upright = text.get_rotation() == 90.0
        have, room = text.get_window_extent(), axis.get_window_extent()
        share = room.height / have.height if upright else room.width / have.width
        longest = max(map(len, text.get_text().split("\n")), default=0)
        if share >= 1.0 or longest < 8:
            return
        text.set_text(textwrap.fill(words, max(int(0.97 * share * longest), 6)))


def save(figure: Figure, path: Path) -> None:
    """Write a figure; the format follows the file name. No dates inside, so equal input gives equal bytes."""
    metadata = {".svg": {"Date": None}, ".pdf": {"CreationDate": None}}.get(path.suffix.lower())
    with look():
        figure.savefig(path, metadata=metadata)
