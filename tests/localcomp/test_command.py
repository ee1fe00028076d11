"""The command as a user types it: output, JSON, files, exit statuses."""

from __future__ import annotations

import csv
import io
import json
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

from localcomp import __version__
from localcomp.curves import pair_curves
from localcomp.figures.distribution import distribution_figure
from localcomp.figures.style import save
from localcomp.inputs import read_state
from localcomp.report import report_state
from tests.localcomp.sweeping import run

KEYS = (
    "status", "closure", "temperature", "packing_fraction", "mole_fractions", "coordination_numbers",
    "local_mole_fractions", "neighbor_ratios", "contact_values", "internal_energy", "compressibility_factor",
    "inverse_compressibility", "numerical_error", "stats",
)  # fmt: skip
NO_SOLUTION = """\
[mixture]
diameter = [1.0, 1.0]
well_depth = [1.0, 1.0]
k = 0.2
[state]
temperature = 1.0
packing_fraction = 0.40
mole_fractions = [0.5, 0.5]
closure = "py"
"""


@pytest.fixture
def demo(tmp_path: Path) -> Path:
    assert run("new", tmp_path / "demo").returncode == 0
    return tmp_path / "demo"


def test_new_writes_files_that_run_and_does_not_overwrite(demo: Path) -> None:
    done = run("state", demo / "state.toml")
    assert done.returncode == 0, done.stderr
    for part in ("Neighbours in the first shell", "What models state", "Wilson", "quasi-chemical", "NRTL (alpha = 0.3)",
                 "stated/found", "Thermodynamics", "Idealised spheres"):  # fmt: skip
        assert part in done.stdout
    again = run("new", demo)
    assert again.returncode == 2
    assert "not overwritten" in again.stderr
    study = run("new", "--study", demo)
    assert study.returncode == 0
    assert (demo / "study.toml").exists()


def test_json_is_one_object_with_the_promised_keys(demo: Path) -> None:
    done = run("state", demo / "state.toml", "--json", "--closure", "msa", "--accuracy", "1e-6", "--compare-closures")
    assert done.returncode == 0, done.stderr
    body = json.loads(done.stdout)
    assert set(KEYS) <= set(body)
    assert body["status"] == "solved"
    assert body["closure"] == "msa"
    assert np.array(body["coordination_numbers"]).shape == (2, 2)
    assert set(body["numerical_error"]) <= set(body)
    assert set(body["numerical_error"]["compressibility_factor"]) <= set(body["compressibility_factor"])
    assert {"steps", "grid_points", "seconds"} <= set(body["stats"])
    assert set(body["closures"]) == {"msa", "py", "hnc", "rhnc"}
    errors = np.array(body["numerical_error"]["coordination_numbers"])
    assert np.all(errors <= 1e-6 * np.array(body["coordination_numbers"]))


def test_no_solution_is_status_three_with_the_end_of_the_branch(tmp_path: Path) -> None:
    path = tmp_path / "cold.toml"
    path.write_text(NO_SOLUTION)
    done = run("state", path, "--json")
    assert done.returncode == 3
    body = json.loads(done.stdout)
    assert set(KEYS) <= set(body)
    assert body["status"] in ("branch_end", "unstable_fluid")
    assert body["coordination_numbers"] is None
    assert 1.3 < body["branch_end_temperature"] < 1.4
    spoken = run("state", path)
    assert spoken.returncode == 3
    assert "followed from hard spheres down to kT = 1.3" in spoken.stderr
    assert "Traceback" not in spoken.stderr
    compared = run("state", path, "--compare-closures")
    assert compared.returncode == 3
    assert "All closures side by side" in compared.stdout


def test_csv_and_figure(demo: Path) -> None:
    table, figure = demo / "t.csv", demo / "g.png"
    done = run("state", demo / "state.toml", "--csv", table, "--plot", figure, "--compare-closures")
    assert done.returncode == 0, done.stderr
    rows = list(csv.DictReader(io.StringIO(table.read_text())))
    assert len(rows) == 16
    assert {row["closure"] for row in rows} == {"msa", "py", "hnc", "rhnc"}
    wanted = ("rhnc", "small", "large")
    one = next(row for row in rows if (row["closure"], row["center"], row["neighbor"]) == wanted)
    assert float(one["coordination_number"]) == pytest.approx(5.2429, abs=1e-3)
    assert float(one["stated ratio: Wilson; m = 1"]) == pytest.approx(np.exp((0.9 * 1.5**0.5 - 1.0) / 2.0))
    assert figure.read_bytes().startswith(b"\x89PNG")


@pytest.mark.parametrize(
    ("words", "part"),
    [
        (["--csv", "absent/t.csv"], "does not exist"),
        (["--plot", "g.bmp"], ".png, .svg, .pdf"),
        (["--plot", "."], "must end in"),
        (["--csv", "."], "is a directory"),
        (["--closure", "mas"], "known closures"),
        (["--accuracy", "0"], "1e-10"),
        (["--accuracy", "much"], "accuracy"),
        (["--colour"], "--colour"),
    ],
)
def test_wrong_options_are_status_two(demo: Path, words: list[str], part: str) -> None:
    done = run("state", demo / "state.toml", *words)
    assert done.returncode == 2
    assert part in done.stderr
    assert "Traceback" not in done.stderr


def test_calibrate(demo: Path) -> None:
    done = run("calibrate", demo / "liquid.toml", "--json")
    assert done.returncode == 0, done.stderr
    body = json.loads(done.stdout)
    assert body["conditions"]["residual_energy"]["reached"] == pytest.approx(-5786.0, rel=1e-6)
    assert body["conditions"]["pressure"]["reached"] == pytest.approx(101.302, abs=1.0)
    spoken = run("calibrate", demo / "liquid.toml")
    assert "well depth eps/k" in spoken.stdout
    assert f"{body['well_depth']:.4f}" in spoken.stdout


def test_calibrate_without_answer_is_status_three(demo: Path) -> None:
    text = (demo / "liquid.toml").read_text().replace("-5786.0", "-50.0")
    (demo / "liquid.toml").write_text(text)
    done = run("calibrate", demo / "liquid.toml")
    assert done.returncode == 3
    assert "too small" in done.stderr


def test_version_and_help() -> None:
    assert run("--version").stdout.strip() == f"localcomp {__version__}"
    done = run("--help")
    assert done.returncode == 0
    for name in ("new", "state", "calibrate", "check", "sweep", "table"):
        assert name in done.stdout


def test_help_waits_for_no_heavy_import() -> None:
    heavy = "('numpy', 'scipy', 'matplotlib', 'pyfftw')"
    code = f"import sys, localcomp.cli.main; print([m for m in {heavy} if m in sys.modules])"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


def test_kelvin_and_angstrom_give_joules(tmp_path: Path) -> None:
    study = Path(__file__).resolve().parents[2] / "studies" / "argon_krypton" / "state.toml"
    done = run("state", study, "--json")
    body = json.loads(done.stdout)
    assert body["units"]["internal_energy"] == "J/mol"
    assert -7000.0 < body["internal_energy"] < -6000.0
    assert body["pressure_mpa"]["energy"] < 0.0
    assert any("tension" in text for text in body["warnings"])


def test_a_figure_is_drawn_from_tables_and_is_reproducible(demo: Path, tmp_path: Path) -> None:
    report = report_state(read_state(demo / "state.toml"))
    curves = pair_curves(report)
    assert [(c.center, c.neighbor) for c in curves] == [("small", "small"), ("small", "large"), ("large", "large")]
    for curve in curves:
        assert np.interp(curve.shell, curve.radii, curve.count) == pytest.approx(curve.count_in_shell, rel=0.01)
    for suffix in (".svg", ".png"):
        for n in (1, 2):
            save(distribution_figure(curves, "title", "length unit"), tmp_path / f"{n}{suffix}")
        assert (tmp_path / f"1{suffix}").read_bytes() == (tmp_path / f"2{suffix}").read_bytes()
    figure = distribution_figure(curves, "title", "length unit")
    labels = {axis.get_xlabel() for axis in figure.axes if axis.get_xlabel()}
    assert labels == {"r / length unit"}
    assert {axis.get_ylabel() for axis in figure.axes} == {"g(r)", "neighbours within r"}
