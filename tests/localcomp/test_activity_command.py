"""`localcomp activity` as a user types it, and what it hands to table, figure and JSON."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from localcomp.activity import activity_at_packing
from localcomp.activity_curves import isotherm_panels
from localcomp.activity_report import (
    MPA_PER_KELVIN_A3,
    as_json,
    infinite_rows,
    read_requests,
    report_isotherm,
    study_json,
)
from localcomp.figures.activity import activity_figure
from localcomp.figures.style import save
from ozsolve import Mixture
from tests.localcomp.state_files import LIQUID, NO_SOLUTION, STATE, STUDY, TERNARY, with_line
from tests.localcomp.sweeping import run

ADDITIVE = TERNARY.replace("diameter = 3.6\n", "")


def request(path: Path, basis: str = "packing", compare: bool = False):
    return read_requests(path, None, None, basis, None, compare)


def test_json_of_a_state_file(write: Callable[..., Path]) -> None:
    path = write(STATE)
    done = run("activity", path, "--json")
    assert done.returncode == 0, done.stderr
    body = json.loads(done.stdout)
    x = np.array(body["x"])
    assert x.shape == (11, 2)
    found = activity_at_packing(Mixture([1.0, 1.5], [1.0, 1.5], k=0.1), 2.0, 0.4, x, accuracy=1e-4)[0]
    assert np.array(body["ln_gamma"]) == pytest.approx(found.ln_gamma, abs=1e-6)
    assert body["ln_gamma_infinite"] == pytest.approx([found.ln_gamma[0, 0], found.ln_gamma[-1, 1]], abs=1e-6)
    parts = body["parts"]
    assert set(parts) == {"flory_huggins", "hard_sphere", "attraction"}
    for key in ("ln_gamma", "ln_gamma_infinite"):
        total = sum(np.array(part[key]) for part in parts.values())
        assert total == pytest.approx(np.array(body[key]), abs=1e-9)
        for block in ("numerical_error", "route_gap", "closure_gap"):
            assert np.isfinite(np.array(body[block][key], dtype=float)).all()
    assert np.max(body["numerical_error"]["ln_gamma"]) < 1e-3
    assert len(body["excess_energy"]) == 11
    assert set(body["closures"]) == {"msa", "py", "hnc"}
    assert body["stability"]["splitting"] == {"energy_route": [], "kirkwood_buff": [], "no_solution": []}
    assert "Idealised spheres" in body["caution"]


def test_table_and_figure(write: Callable[..., Path], tmp_path: Path) -> None:
    path, figure = write(STATE), tmp_path / "a.svg"
    done = run("activity", path, "--one-closure", "--plot", figure)
    assert done.returncode == 0, done.stderr
    for part in ("infinite dilution", "Flory-Huggins", "hard spheres", "attraction", "KB - energy", "A_ex", "small"):
        assert part in done.stdout
    assert figure.stat().st_size > 1000


def test_constant_pressure(write: Callable[..., Path]) -> None:
    text = with_line(STATE, "temperature", "temperature = 2.5")
    done = run("activity", write(text), "--basis", "pressure", "--one-closure", "--json")
    assert done.returncode == 0, done.stderr
    body = json.loads(done.stdout)
    assert body["basis"] == "pressure"
    middle = [row[0] for row in body["x"]].index(0.5)
    assert body["packing_fractions"][middle] == pytest.approx(0.4, abs=1e-4)
    assert len(body["excess_volume"]) == len(body["excess_enthalpy"]) == 11
    assert body["pressure"] > 0.0


def test_three_species_and_units(write: Callable[..., Path], tmp_path: Path) -> None:
    (asked,) = request(write(ADDITIVE))
    report = report_isotherm(asked)
    body = as_json(report)
    assert np.array(body["x"]).shape == (1, 3)
    assert len(body["ln_gamma_infinite"]) == 3
    assert body["units"]["energy"] == "J/mol"
    assert report.found is not None
    expected = report.found.excess_energy[0] * 300.0 * 8.31446261815324
    assert body["excess_energy"][0] == pytest.approx(expected)
    save(activity_figure(isotherm_panels([report])), tmp_path / "three.png")
    assert (tmp_path / "three.png").stat().st_size > 1000
    # k in MPa angstrom^3/K: 1.380649e-23 J/K over 1e-30 m3, in 1e6 Pa
    assert pytest.approx(13.80649, rel=1e-9) == MPA_PER_KELVIN_A3


def test_a_study_has_an_isotherm_per_mixture_and_temperature(write: Callable[..., Path], tmp_path: Path) -> None:
    requests = request(write(STUDY))
    assert len(requests) == 6
    reports = [report_isotherm(one) for one in requests[:2]]
    body = study_json(reports)
    assert [item["x"] for item in body["isotherms"]] == [[[0.0, 1.0], [0.5, 0.5]]] * 2
    assert body["isotherms"][0]["temperature"] != body["isotherms"][1]["temperature"]
    save(activity_figure(isotherm_panels(reports)), tmp_path / "two.pdf")


def test_infinite_dilution_leaves_the_others_in_proportion() -> None:
    assert infinite_rows(np.array([0.2, 0.3, 0.5])) == pytest.approx(
        np.array([[0.0, 0.375, 0.625], [0.2 / 0.7, 0.0, 0.5 / 0.7], [0.4, 0.6, 0.0]])
    )
    assert infinite_rows(np.array([1.0, 0.0])) == pytest.approx(np.array([[0.0, 1.0], [1.0, 0.0]]))


def test_splitting_is_a_warning(write: Callable[..., Path]) -> None:
    text = "[numerics]\naccuracy = 1e-3\n" + NO_SOLUTION.replace("k = 0.2", "k = 0.4").replace(
        "temperature = 1.0", "temperature = 1.2"
    )
    report = report_isotherm(request(write(text.replace('"py"', '"rhnc"')))[0])
    body = as_json(report)
    assert body["status"] == "partly_available"
    assert body["ln_gamma"][5] == [None, None]
    ((low, high), *_) = body["stability"]["splitting"]["no_solution"]
    assert low < 0.2
    assert high > 0.2
    assert any("spinodal" in note for note in body["warnings"])


@pytest.mark.parametrize(
    ("arguments", "part"),
    [
        (["--basis", "volume"], "packing, pressure"),
        (["--pressure", "1.0"], "--basis pressure"),
        (["--closure", "rnhc"], "rhnc"),
        (["--accuracy", "1"], "1e-10"),
        (["--plot", "a.txt"], ".png"),
    ],
)
def test_wrong_options_are_named(write: Callable[..., Path], arguments: list[str], part: str) -> None:
    done = run("activity", write(STATE), *arguments)
    assert done.returncode == 2
    assert part in done.stderr
    assert "Traceback" not in done.stderr


def test_wrong_files_are_named(write: Callable[..., Path]) -> None:
    single = "[mixture]\ndiameter = [1.0]\nwell_depth = [1.0]\n[state]\ntemperature = 2.0\npacking_fraction = 0.4\n"
    for text, part in ((single, "two species"), (LIQUID, "localcomp calibrate")):
        done = run("activity", write(text))
        assert done.returncode == 2
        assert part in done.stderr


def test_no_answer_has_its_own_status(write: Callable[..., Path]) -> None:
    done = run("activity", write(TERNARY), "--json")
    assert done.returncode == 3
    body = json.loads(done.stdout)
    assert body["status"] == "not_available"
    assert "additive" in body["message"]
