"""Figures of an audit: axes, units, legends, marks, and nothing clipped."""

from __future__ import annotations

import numpy as np
import pytest
from matplotlib.figure import Figure

from localcomp.audit import run_audit
from localcomp.auditcurves import (
    line_models,
    ln_ratio_uncertainty,
    merged,
    multiplicity_curves,
    ratio_panels,
    reciprocity_curves,
    shown_mixture,
    slope_table,
    verdict_grid,
)
from localcomp.auditsettings import AuditSettings
from localcomp.evidence import planted
from localcomp.figures.multiplicity import MultiplicityMap, multiplicity_lines, multiplicity_maps
from localcomp.figures.ratios import Curve, ratio_figure, reciprocity_figure, slope_figure
from localcomp.figures.verdicts import OUTCOMES, VerdictGrid, verdict_figure
from localcomp.models import MODELS, Reading
from tests.localcomp.figure_checks import clipped, overlapping, visible_texts
from tests.localcomp.skeleton import skeleton

WILSON = next(m for m in MODELS if m.name == "wilson")
AUDIT = run_audit(planted(skeleton("mild"), WILSON, Reading.ONE_CONTACT, 10.0), AuditSettings(), "rhnc")
NUMBER = shown_mixture(AUDIT)


def all_figures() -> dict[str, Figure]:
    panels = ratio_panels(AUDIT, NUMBER, ln_ratio_uncertainty(AUDIT, [AUDIT.findings.main.ln_ratio + 0.02]))
    implied, found = reciprocity_curves(AUDIT, NUMBER)
    values = np.array([[np.nan, 0.4, 1.2], [-1.5, 1.0, 3.0]])
    maps = [MultiplicityMap(f"{n}", np.array([1.0, 1.5, 2.0]), np.array([1.0, 2.0]), values) for n in range(4)]
    return {
        "verdicts": verdict_figure(verdict_grid(AUDIT), "what holds"),
        "ratios": ratio_figure(panels, "ratios", "1"),
        "boltzmann": slope_figure(slope_table(AUDIT), "slopes"),
        "reciprocity": reciprocity_figure(implied, found, "pairs", ("1", "2"), "1"),
        "maps": multiplicity_maps(maps, "multiplicity"),
        "lines": multiplicity_lines(multiplicity_curves(AUDIT, NUMBER), "multiplicity", "a"),
    }


FIGURES = all_figures()
each = pytest.mark.parametrize("name", FIGURES)


@each
def test_nothing_is_clipped_and_no_legend_covers_a_heading(name: str) -> None:
    assert clipped(FIGURES[name]) == []
    assert overlapping(FIGURES[name]) == []


def test_the_check_sees_a_clipped_text_and_a_covered_heading() -> None:
    line, point = Curve("a", np.array([0.0, 1.0]), np.ones(2)), Curve("found", np.array([0.5]), np.ones(1))
    figure = reciprocity_figure([line], point, "h", ("1", "2"), "1")
    figure.text(0.99, 0.5, "far too long to end inside the page")
    assert clipped(figure) == ["far too long to end inside the page"]
    figure.legends[0].set_loc("upper center")
    figure.suptitle("heading in the way of the legend")
    assert overlapping(figure)


LONG = "Pairs counted from both ends, σ_2/σ_1 = 1.5, ε_2/ε_1 = 2, k = 0.1, l = 0.05, λ = 1.5"
NAMES = ("1,1,1,2-tetrafluoroethane", "2,2,4-trimethylpentane (isooctane)")


def test_long_headings_and_names_stay_clear_of_legends() -> None:
    implied, found = reciprocity_curves(AUDIT, NUMBER)
    for figure in (
        slope_figure(slope_table(AUDIT), LONG),
        reciprocity_figure(implied, found, LONG, NAMES, NAMES[0]),
        multiplicity_lines(multiplicity_curves(AUDIT, NUMBER), LONG, NAMES[0]),
    ):
        assert clipped(figure) == []
        titles = [a._left_title for a in figure.axes]  # type: ignore[attr-defined]
        figure.draw_without_rendering()
        legend = figure.legends[0].get_window_extent()
        assert titles[0].get_text().replace("\n", " ") == LONG
        assert not any(title.get_window_extent().overlaps(legend) for title in titles if title.get_text())


@each
def test_axes_are_named_with_their_units(name: str) -> None:
    figure = FIGURES[name]
    if name == "verdicts":
        return
    labelled = [a for a in figure.axes if a.get_xlabel()]
    assert labelled
    assert all("\n" not in a.get_xlabel() for a in labelled)
    words = " ".join(a.get_xlabel() + a.get_ylabel() for a in figure.axes)
    assert {"ratios": "mole fraction", "boltzmann": "dimensionless", "reciprocity": "mole fraction",
            "maps": "ratio", "lines": "dimensionless"}[name] in words  # fmt: skip


def test_marks_alone_tell_outcomes_apart() -> None:
    """Readable in grey: marker and fill differ for every pair of outcomes."""
    marks = [(mark, fill) for mark, _, _, fill in OUTCOMES.values()]
    assert len(set(marks)) == len(OUTCOMES) == 4
    grid = VerdictGrid(["m"], ["a", "b", "c", "d", "e"], [["holds", "strained", "fails", "undecided", None]],
                       [[0.5, 2.0, 400.0, None, None]])  # fmt: skip
    figure = verdict_figure(grid, "t")
    shown = [line for line in figure.axes[0].get_lines()]
    assert len({(str(line.get_marker()), line.get_fillstyle()) for line in shown}) == 5
    texts = {text for text, _ in visible_texts(figure)}
    assert {"0.5", "2.0", "> 99", "holds", "strained", "fails", "undecided", "not claimed"} <= texts


def test_every_statement_is_drawn_over_what_is_found() -> None:
    figure = FIGURES["ratios"]
    labels = " ; ".join(str(text.get_text()) for text in figure.legends[0].get_texts())
    for model, _ in line_models(AUDIT):
        assert model.label in labels
    panel = next(a for a in figure.axes if a.get_lines())
    wilson = next(line for line in panel.get_lines() if "Wilson, m = 1" in str(line.get_label()))
    assert np.ptp(np.asarray(wilson.get_ydata(), float)) < 1e-12, "Wilson's ratio is free of composition"
    found = panel.containers[0].lines[0]  # type: ignore[attr-defined]
    assert np.allclose(found.get_ydata(), np.asarray(wilson.get_ydata())[0]), "the truth lies on its maker's line"


def test_slopes_are_the_claimed_ones() -> None:
    table = slope_table(AUDIT)
    slopes = dict((round(slope, 6), label) for label, slope in table.slopes)
    assert {0.0, 0.2, 0.3, 0.47, 1.0, 5.0} <= set(slopes)
    assert "Wilson" in slopes[1.0]
    assert "random" in slopes[0.0]
    assert not any("quasi-chemical" in label for label in slopes.values())
    assert np.allclose(table.change, table.exchange)


def test_equal_curves_are_drawn_once_under_both_names() -> None:
    one, two = np.array([1.0, 2.0]), np.array([1.0, 2.1])
    assert [label for label, _ in merged([("a", [one]), ("b", [two]), ("c", [one + 1e-9])])] == ["a; c", "b"]
