"""Regression of activity models: planted parameters, splitting, a pair held to account, the command."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from localcomp.activity import activity_at_packing
from localcomp.executors import SerialExecutor
from localcomp.figures.fits import Cloud, energy_figure, fit_figure, ratio_parity
from localcomp.fit import fitted_ln_gamma, pair_matrix, regress, true_values
from localcomp.fitcurves import energy_clouds, fit_panels, pair_heading, ratio_clouds
from localcomp.fitpair import GOOD_FIT, PairTask, examine_pair, unfitted
from localcomp.fitstudy import FitReport, fit_study, pair_tasks, ternary_tasks
from localcomp.models import MODELS, ActivityModel, Adjustable, ModelInput, Reading, ln_gamma
from localcomp.neighbors import count_neighbors
from localcomp.shells import WellEdge
from localcomp.stability import stability_criterion, unstable_ranges
from localcomp.study import read_study
from ozsolve import Mixture, State, solve
from tests.localcomp.figure_checks import clipped, overlapping

BY_NAME = {model.name: model for model in MODELS}
PAIR = Mixture([1.0, 1.3], [1.0, 1.4], k=0.05)
X = np.linspace(0.05, 0.95, 7)
ROWS = np.tile(np.column_stack([X, 1.0 - X]), (2, 1))
WARMTH = np.repeat([1.5, 2.0], len(X))
PLANTED = {
    Adjustable.EXCHANGE: [np.array([-0.6, 0.35]), np.array([0.2, -0.9])],
    Adjustable.INTERCHANGE: [np.array([-0.15]), np.array([0.08])],
    Adjustable.UNLIKE: [np.array([1.05]), np.array([1.25])],
}
every = pytest.mark.parametrize("model", MODELS, ids=lambda model: model.name)


@every
def test_planted_parameters_are_recovered(model: ActivityModel) -> None:
    """Data made by a model give its parameters and its ln gamma back to 1e-6; the data fix every parameter here."""
    for values in PLANTED[model.adjustable]:
        data = fitted_ln_gamma(model, PAIR, pair_matrix(model, values), WARMTH, ROWS, 10.0)
        found = regress(model, PAIR, WARMTH, ROWS, data, 10.0)
        assert found.values == pytest.approx(values, abs=1e-6)
        again = fitted_ln_gamma(model, PAIR, pair_matrix(model, found.values), WARMTH, ROWS, 10.0)
        assert again == pytest.approx(data, abs=1e-6)
        assert found.rms < 1e-7


@every
def test_another_models_data_are_not_recovered(model: ActivityModel) -> None:
    """The check can fail: data of a model with another form leave a misfit."""
    other = BY_NAME["wilson" if model.name != "wilson" else "nrtl-0.3"]
    data = fitted_ln_gamma(other, PAIR, pair_matrix(other, np.array([-1.5, 1.2])), WARMTH, ROWS, 10.0)
    assert regress(model, PAIR, WARMTH, ROWS, data, 10.0).rms > 1e-4


def test_standard_errors_and_correlation_are_those_of_repeated_noise() -> None:
    """s^2 (J^T J)^-1 (Bard 1974) against the scatter of 60 fits to noisy data."""
    model, values = BY_NAME["nrtl-0.3"], np.array([-0.6, 0.35])
    data = fitted_ln_gamma(model, PAIR, pair_matrix(model, values), WARMTH, ROWS, 10.0)
    rng = np.random.default_rng(7)
    fits = [regress(model, PAIR, WARMTH, ROWS, data + 0.005 * rng.standard_normal(data.shape), 10.0) for _ in range(60)]
    scatter = np.std([fit.values for fit in fits], axis=0, ddof=1)
    stated = np.median([fit.standard_errors for fit in fits], axis=0)
    assert stated == pytest.approx(scatter, rel=0.3)
    correlation = np.corrcoef(np.array([fit.values for fit in fits]).T)[0, 1]
    assert np.median([fit.correlation for fit in fits]) == pytest.approx(correlation, abs=0.1)
    assert not np.allclose(scatter, 3.0 * stated, rtol=0.3)


@every
def test_fitted_energies_of_one_contact_are_the_model_itself(model: ActivityModel) -> None:
    """With the true energies of one contact a fit's ln gamma is the model's own under its reading."""
    reading = Reading.ALL_CONTACTS if model.adjustable is Adjustable.UNLIKE else Reading.ONE_CONTACT
    energies = pair_matrix(model, true_values(model, PAIR))
    found = fitted_ln_gamma(model, PAIR, energies, WARMTH, ROWS, 10.0)
    assert found == pytest.approx(unfitted(model, reading, PAIR, WARMTH, ROWS, 10.0), rel=1e-12, abs=1e-14)


def test_a_model_cannot_be_fitted_to_less_than_it_has_parameters() -> None:
    with pytest.raises(ValueError, match="1 values of ln gamma for 2 parameters"):
        regress(BY_NAME["wilson"], PAIR, np.array([1.5]), np.array([[0.5, 0.5]]), np.array([[0.1, np.nan]]), 10.0)


def splits(
    model: ActivityModel, exchange: tuple[float, float], sizes: tuple[float, float] = (1.0, 1.0)
) -> list[tuple[float, float]]:
    x = np.linspace(0.0, 1.0, 401)[1:-1]
    rows = np.column_stack([x, 1.0 - x])
    pair = Mixture(sizes, [1.0, 1.0])
    found = fitted_ln_gamma(model, pair, pair_matrix(model, np.array(exchange)), np.full(len(x), 1.0), rows, 10.0)
    return unstable_ranges(x, stability_criterion(x, found))


@pytest.mark.parametrize("seed", range(12))
def test_wilson_never_splits(seed: int) -> None:
    """Wilson's equation cannot give two liquids (Wilson 1964; check values part 6)."""
    exchange = np.random.default_rng(seed).uniform(-6.0, 6.0, 2)
    assert splits(BY_NAME["wilson"], (float(exchange[0]), float(exchange[1]))) == []


def test_nrtl_and_uniquac_split() -> None:
    """Renon and Prausnitz 1968, Abrams and Prausnitz 1975: both can give two liquids, and the test finds the range."""
    assert splits(BY_NAME["nrtl-0.2"], (-2.0, -2.0)) != []
    assert splits(BY_NAME["uniquac"], (-1.5, -1.5), (1.0, 1.6)) != []
    assert splits(BY_NAME["uniquac"], (-1.5, -1.5)) == []  # with r = q = 1 it is Wilson's equation
    assert splits(BY_NAME["wilson"], (-1.5, -1.5), (1.0, 1.6)) == []
    assert splits(BY_NAME["nrtl-0.2"], (-0.5, -0.5)) == []
    ((low, high),) = splits(BY_NAME["random-mole"], (-3.0, -3.0))  # x1 x2 = 1/(2 w): Bragg and Williams 1934
    edge = 0.5 * (1.0 - np.sqrt(1.0 - 4.0 / (2.0 * 2.0 * 3.0)))
    assert (low, high) == pytest.approx((edge, 1.0 - edge), abs=2e-3)


TASK = PairTask(
    Mixture([1.0, 1.0], [1.0, 1.5], k=0.05), {"size_ratio": 1.0, "energy_ratio": 1.5, "k": 0.05}, (1.9, 2.5),
    (0.0, 0.1, 0.3, 0.5, 0.7, 0.9, 1.0), 0.40, 0.35, MODELS, 10.0, 1e-4, "rhnc", WellEdge(),
)  # fmt: skip


@pytest.fixture(scope="module")
def result():
    return examine_pair(TASK)


def test_right_for_the_wrong_reason(result) -> None:
    """Equal sizes: the quasi-chemical theory has the neighbours; Wilson and UNIQUAC fit as well and have them wrong."""
    assert result.reason == ""
    tests = {t.regression.model.name: t for t in result.tests}
    assert tests["quasi-chemical"].verdict == "right for the right reason"
    assert tests["wilson"].verdict == "right for the wrong reason"
    assert tests["uniquac"].verdict == "right for the wrong reason"
    assert all(t.regression.rms < GOOD_FIT for t in result.tests)
    assert tests["quasi-chemical"].multiplicity[0] == pytest.approx(1.0, abs=0.2)
    assert tests["random-mole"].multiplicity[0] == pytest.approx(5.5, abs=1.0)


def test_what_is_compared_is_the_truth(result) -> None:
    n = 3
    x, t = result.x[n], result.temperature[n]
    state = State(t, (x, 1.0 - x), packing_fraction=0.40)
    ratios = count_neighbors(solve(TASK.mixture, state, accuracy=1e-4)).neighbor_ratios
    assert result.ratios[n] == pytest.approx([ratios[0, 1], ratios[1, 0]], rel=1e-3)
    (truth,) = activity_at_packing(TASK.mixture, float(t), 0.40, [[x, 1.0 - x]], accuracy=1e-4, routes=False)
    assert result.ln_gamma[n] == pytest.approx(truth.ln_gamma[0], abs=1e-6)
    test = next(u for u in result.tests if u.regression.model.name == "wilson")
    d12 = test.regression.values[0] / t
    assert test.implied[n, 0] == pytest.approx(np.exp(d12), rel=1e-12)
    rows = np.column_stack([result.x, 1.0 - result.x])
    here = fitted_ln_gamma(BY_NAME["wilson"], TASK.mixture, test.energies, result.temperature, rows, 10.0)
    inner = (result.x > 0.0) & (result.x < 1.0)
    assert test.regression.rms == pytest.approx(float(np.sqrt(np.mean((here - result.ln_gamma)[inner] ** 2))), rel=1e-6)
    dilute = [abs(here[k, s] - result.ln_gamma[k, s]) for k in range(len(here)) for s in (0, 1)
              if (result.x[k] == 0.0 and s == 0) or (result.x[k] == 1.0 and s == 1)]  # fmt: skip
    assert test.dilution.largest == pytest.approx(max(dilute), rel=1e-9)


def test_unfitted_is_the_model_with_the_true_energies(result) -> None:
    test = next(u for u in result.tests if u.regression.model.name == "uniquac")
    rows = np.column_stack([result.x, 1.0 - result.x])
    off = []
    for t, x, true in zip(result.temperature, rows, result.ln_gamma, strict=True):
        given = ModelInput.of(TASK.mixture, State(float(t), tuple(x), packing_fraction=0.4))
        off.append(ln_gamma(BY_NAME["uniquac"], given, Reading.ALL_CONTACTS) - true)
    assert test.unfitted[Reading.ALL_CONTACTS].rms == pytest.approx(float(np.sqrt(np.mean(np.square(off)))), rel=1e-9)


def test_figures_of_fits(result) -> None:
    report = FitReport(None, (result,), (), "")  # type: ignore[arg-type]  # the figures need no study
    figures = [
        fit_figure(fit_panels(result), f"ln gamma, {pair_heading(result, ' K')}", ("1", "2")),
        ratio_parity(ratio_clouds(report), 0.15, "a study with a longer name: neighbours"),
        energy_figure(energy_clouds(report), "a study with a longer name: energies", "energy unit", 10.0),
    ]
    for figure in figures:
        assert clipped(figure) == []
        assert overlapping(figure) == []
    titles = [axis.get_title() for axis in figures[0].axes if axis.get_visible()]
    assert len(titles) == len(MODELS)
    assert all("rms" in title for title in titles)
    assert any(axis.get_xlabel() == "true, energy unit" for axis in figures[2].axes)
    shown = {axis.get_title(): axis for axis in figures[2].axes if axis.get_visible()}
    assert set(shown) == {model.label for model in MODELS}
    one_fluid = shown["random mixing by pair volume"].lines[0]
    assert one_fluid.get_xdata() == pytest.approx(true_values(BY_NAME["random-mole"], TASK.mixture))
    other = energy_figure(energy_clouds(report), "heading", "K", 6.0).axes[0].lines[2]
    assert np.asarray(other.get_ydata()) == pytest.approx(3.0 * np.asarray(other.get_xdata()))


STUDY = """\
[class]
size_ratio = [1.0, 1.2]
energy_ratio = [1.0, 1.4]
k = 0.05
[conditions]
temperature = [2.0, 2.6]
packing_fraction = {packing}
composition = {composition}
[numerics]
accuracy = 1e-4
"""


def test_a_study_and_its_ternary(write: Callable[..., Path]) -> None:
    study = read_study(write(STUDY.format(packing=0.4, composition="[0.1, 0.5, 0.9]"), "study.toml"))
    models = [BY_NAME["quasi-chemical"], BY_NAME["random-pair-volume"]]
    seen: list[tuple[int, int]] = []
    report = fit_study(study, models, SerialExecutor(), lambda done, total: seen.append((done, total)))
    assert len(report.pairs) == 4
    assert seen[-1] == (7, 7)
    assert [t.model.name for t in report.ternaries] == ["quasi-chemical", "random-pair-volume"]
    like = next(p for p in report.pairs if (p.task.labels["size_ratio"], p.task.labels["energy_ratio"]) == (1.0, 1.0))
    assert like.tests[0].regression.rms < 5e-3
    test = report.ternaries[0]
    assert test.truth.shape == (4, 3)
    assert np.isfinite(test.predicted).all()
    assert test.misfit.largest == pytest.approx(float(np.max(np.abs(test.predicted - test.truth))))
    assert report.pairs[0].task.other_packing == pytest.approx(0.36)


THREE = Mixture([1.0, 1.3, 1.6], [1.0, 1.2, 1.4], k=0.05)


@every
@pytest.mark.parametrize("both", [(0, 1), (0, 2), (1, 2)])
def test_a_ternary_without_one_species_is_the_pair(model: ActivityModel, both: tuple[int, int]) -> None:
    """Exact, if r and q are counted in one segment; with the smaller sphere of each pair UNIQUAC fails in 2 + 3."""
    values = np.array([1.3]) if model.adjustable is Adjustable.UNLIKE else np.array([-0.5, 0.2])
    pair, energies, x = pair_matrix(model, values), np.full((3, 3), 0.4), np.zeros((1, 3))
    energies[np.ix_(both, both)] = pair
    x[0, list(both)] = 0.3, 0.7
    ternary = fitted_ln_gamma(model, THREE, energies, np.array([2.0]), x, 10.0, 1.0)[:, list(both)]
    alone = THREE.subset(both), pair, np.array([2.0]), x[:, list(both)], 10.0
    assert fitted_ln_gamma(model, *alone, 1.0) == pytest.approx(ternary, abs=1e-12)
    if model.name == "uniquac" and both == (1, 2):
        assert fitted_ln_gamma(model, *alone) != pytest.approx(ternary, abs=1e-2)


def test_pairs_of_a_ternary_are_fitted_in_its_segment(write: Callable[..., Path]) -> None:
    text = STUDY.format(packing=0.4, composition="[0.1, 0.5]")
    study = read_study(write(text.replace("size_ratio = [1.0, 1.2]", "size_ratio = [1.2, 1.4]"), "study.toml"))
    tasks = ternary_tasks(study, pair_tasks(study, [BY_NAME["uniquac"]]))
    assert [task.segment for task in tasks] == [1.0, 1.0, 1.0]
    assert min(tasks[2].mixture.diameter) >= 1.2


def test_a_temperature_without_pure_liquids_is_left_out() -> None:
    """Too cold for a fluid at this density; the warmer isotherm is fitted as if alone."""
    models = (BY_NAME["quasi-chemical"],)
    alone = examine_pair(replace(TASK, temperatures=(2.5,), packing_fraction=0.15, models=models))
    found = examine_pair(replace(TASK, temperatures=(0.6, 2.5), packing_fraction=0.15, models=models))
    assert found.left_out == (0.6,)
    assert found.task.temperatures == (2.5,)
    assert found.tests[0].regression.values == pytest.approx(alone.tests[0].regression.values, abs=1e-9)
    assert np.isfinite(found.tests[0].other_temperature.rms)
    none = examine_pair(replace(TASK, temperatures=(0.5, 0.6), packing_fraction=0.15, models=models))
    assert "no solution" in none.reason
    assert none.tests == ()


@pytest.mark.parametrize(("low", "high"), [(0.85, 1.2), (0.97, 1.03), (0.3, 4.0)])
def test_ratio_axes_have_plain_numbers_however_narrow(low: float, high: float) -> None:
    cloud = Cloud("one", np.array([low, high]), np.array([low, high]))
    figure = ratio_parity([cloud, cloud], 0.15, "heading")
    figure.draw_without_rendering()
    for axis in (figure.axes[0].xaxis, figure.axes[0].yaxis):
        left, right = axis.get_view_interval()
        shown = [float(t.label1.get_text()) for t in axis.get_major_ticks() if left <= t.get_loc() <= right]
        assert 2 <= len(shown) <= 5
        assert not any(t.label1.get_text() for t in axis.get_minor_ticks())


def test_two_densities_predict_each_other(write: Callable[..., Path]) -> None:
    study = read_study(write(STUDY.format(packing="[0.35, 0.4]", composition="[0.1, 0.5]"), "study.toml"))
    tasks = pair_tasks(study, MODELS)
    assert {(t.packing_fraction, t.other_packing) for t in tasks} == {(0.35, 0.4), (0.4, 0.35)}
    assert tasks[0].compositions == (0.0, 0.1, 0.5, 1.0)


def test_the_command(run: Callable[..., object], write: Callable[..., Path], tmp_path: Path) -> None:
    path, out = write(STUDY.format(packing=0.4, composition="[0.2, 0.5, 0.8]"), "study.toml"), tmp_path / "out"
    ran = run("fit", path, "--out", out, "--models", "wilson,quasi-chemical", "--json", "--workers", 1)
    assert ran.status == 0, ran.err  # type: ignore[attr-defined]
    body = json.loads(ran.out)  # type: ignore[attr-defined]
    assert {m["model"] for m in body["models"]} == {"Wilson", "quasi-chemical"}
    rows = list(csv.DictReader(io.StringIO((out / "fits.csv").read_text(encoding="utf-8"))))
    assert len(rows) == 4 * len(body["models"])
    assert {row["verdict"] for row in rows} <= {
        "right for the right reason", "right for the wrong reason", "does not fit"
    }  # fmt: skip
    implied = list(csv.DictReader(io.StringIO((out / "implied_ratios.csv").read_text(encoding="utf-8"))))
    assert len(implied) == len(rows) * 2 * 5 * 2  # two temperatures, five compositions with the ends, two directions
    assert (out / "ternary.csv").read_text(encoding="utf-8").count("\n") == 1 + len(body["models"]) * 4 * 3
    for name in ("fits", "implied_ratios", "fitted_energies"):
        assert (out / f"{name}.png").read_bytes().startswith(b"\x89PNG")
    plain = run("fit", path, "--out", out, "--models", "quasi-chemical", "--workers", 1)
    assert "wrong reason" in plain.out  # type: ignore[attr-defined]
    assert "practice decide" in plain.out.replace("\n", " ")  # type: ignore[attr-defined]


@pytest.mark.parametrize(
    ("text", "words"),
    [
        (STUDY.format(packing=0.4, composition="[0.0, 1.0]"), ["composition", "strictly between 0 and 1"]),
        (
            '[[mixtures]]\nnames = ["a", "b", "c"]\ndiameter = [1, 1, 1]\nwell_depth = [1, 1, 1]\n[conditions]\n'
            "temperature = 2\npacking_fraction = 0.4\nmole_fractions = [[0.2, 0.3, 0.5]]\n",
            ["two species"],
        ),
    ],
)
def test_studies_that_cannot_be_fitted(
    text: str, words: list[str], run: Callable[..., object], write: Callable[..., Path], tmp_path: Path
) -> None:
    ran = run("fit", write(text, "study.toml"), "--out", tmp_path / "out")
    assert ran.status == 2  # type: ignore[attr-defined]
    assert all(word in ran.err for word in words)  # type: ignore[attr-defined]
