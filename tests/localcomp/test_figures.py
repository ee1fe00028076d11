"""Figures are built from tables alone, show what is in them, and are equal byte by byte."""

from __future__ import annotations

from dataclasses import replace

import matplotlib as mpl
import numpy as np
import pytest

from localcomp.curves import pair_curves
from localcomp.figures.distribution import LONGEST_NAME, PairCurve, distribution_figure, short
from localcomp.figures.style import FORMATS, look, save
from localcomp.inputs import read_state
from localcomp.report import report_state
from tests.localcomp.state_files import STATE, TERNARY, with_line


def drawn_by_hand(center: str = "a", neighbor: str = "b", reverse: bool = True) -> PairCurve:
    r = np.linspace(0.0, 3.0, 61)
    return PairCurve(
        center, neighbor, r, np.where(r < 1.0, 0.0, 1.0 + np.exp(-r)), r, r**3, 0.5 * r**3 if reverse else None,
        core=1.0, shell=1.5, count_in_shell=1.5**3, reverse_in_shell=0.5 * 1.5**3,
    )  # fmt: skip


@pytest.mark.parametrize("panels", [1, 2, 3, 6])
def test_one_panel_per_pair(panels):
    curves = [drawn_by_hand(f"c{n}", f"n{n}", reverse=n > 0) for n in range(panels)]
    figure = distribution_figure(curves, "the title", "angstrom")
    shown = [axis for axis in figure.axes if axis.get_visible() and axis.get_title()]
    assert [axis.get_title() for axis in shown] == [f"c{n} - n{n}" for n in range(panels)]
    assert all(axis.get_xlabel() == "r / angstrom" for axis in shown)
    assert figure.get_suptitle() == "the title"
    lines = shown[-1].get_lines()
    assert any(np.array_equal(line.get_ydata(), curves[-1].g) for line in lines)


def test_counts_in_the_shell_are_written_beside_the_curves():
    figure = distribution_figure([drawn_by_hand()], "t", "r")
    texts = [text.get_text() for axis in figure.axes for text in axis.texts]
    assert {"3.38", "1.69", "shell"} <= set(texts)


@pytest.mark.parametrize("suffix", FORMATS)
def test_equal_input_gives_equal_bytes(suffix, tmp_path):
    for name in ("one", "two"):
        save(distribution_figure([drawn_by_hand()], "t", "r"), tmp_path / f"{name}{suffix}")
    first, second = ((tmp_path / f"{name}{suffix}").read_bytes() for name in ("one", "two"))
    assert len(first) > 1000
    assert first == second
    save(distribution_figure([replace(drawn_by_hand(), shell=1.6)], "t", "r"), tmp_path / f"three{suffix}")
    assert (tmp_path / f"three{suffix}").read_bytes() != first


def test_dollars_underscores_and_long_names_are_drawn_as_they_are(tmp_path):
    for names in (("$x", "_y$"), ("$\\frac$", "$_$"), (40 * "m", 40 * "n")):
        figure = distribution_figure([drawn_by_hand(*names)], "$ and $\\bad{", "r")
        save(figure, tmp_path / "figure.svg")
        assert figure.axes[0].get_title() == f"{short(names[0])} - {short(names[1])}"
    assert len(short(40 * "m")) == LONGEST_NAME


def test_the_users_own_settings_are_left_alone():
    def settings():  # the backend is chosen when it is first needed, whoever asks
        return {key: value for key, value in mpl.rcParams.items() if key != "backend"}

    before = settings()
    with look():
        assert mpl.rcParams["svg.hashsalt"] == "localcomp"
    distribution_figure([drawn_by_hand()], "t", "r")
    assert settings() == before


@pytest.mark.parametrize("text", [STATE, TERNARY], ids=["binary", "ternary"])
def test_curves_of_a_report(text, write):
    report = report_state(read_state(write(text)))
    curves = pair_curves(report)
    size = report.request.mixture.species
    assert len(curves) == size * (size + 1) // 2
    assert report.neighbors is not None
    for curve in curves:
        i, j = (report.request.mixture.names.index(name) for name in (curve.center, curve.neighbor))
        assert np.all(np.diff(curve.r) >= 0.0)
        assert np.all(curve.g[curve.r < curve.core] == 0.0)
        at_core = curve.g[curve.r == curve.core]
        assert (at_core[0], at_core[-1]) == (0.0, report.solution.contact_values[i, j])
        assert np.interp(curve.shell, curve.radii, curve.count) == pytest.approx(curve.count_in_shell, rel=5e-3)
        assert (curve.reverse_count is None) == (i == j)
        assert curve.reverse_in_shell == report.neighbors.coordination_numbers[j, i]


def test_infinite_dilution_can_be_drawn(write, tmp_path):
    report = report_state(read_state(write(with_line(STATE, "mole_fractions", "mole_fractions = [0.0, 1.0]"))))
    figure = distribution_figure(pair_curves(report), "dilute", "r")
    save(figure, tmp_path / "dilute.png")
    assert (tmp_path / "dilute.png").stat().st_size > 1000
