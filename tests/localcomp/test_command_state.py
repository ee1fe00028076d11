"""`localcomp state` in this process: tables, JSON, statuses, names, outputs that cannot be written."""

from __future__ import annotations

import csv
import io
import json
import math

import pytest

import localcomp.report
from tests.localcomp.state_files import NO_SOLUTION, STATE, TERNARY, with_line, without

NUMBERS = (
    "coordination_numbers", "local_mole_fractions", "neighbor_ratios", "contact_values", "internal_energy",
    "compressibility_factor", "inverse_compressibility",
)  # fmt: skip
PLAIN = ("status", "closure", "temperature", "packing_fraction", "mole_fractions", "stats")
GAS = """\
[mixture]
diameter = [1.0, 1.0]
well_depth = [-1000.0, -1000.0]
[state]
temperature = 1.0
packing_fraction = 0.05
mole_fractions = [0.5, 0.5]
"""


def leaves(value):
    """Every number, text and null of a JSON value."""
    if isinstance(value, dict | list):
        for item in value.values() if isinstance(value, dict) else value:
            yield from leaves(item)
    else:
        yield value


def shape(value):
    """The structure of a JSON value without its numbers."""
    if isinstance(value, dict):
        return {key: shape(item) for key, item in value.items()}
    return [shape(item) for item in value] if isinstance(value, list) else None


@pytest.mark.parametrize("text", [STATE, TERNARY], ids=["binary", "ternary"])
def test_json_is_whole_and_finite(text, write, run):
    ran = run("state", write(text), "--json")
    assert ran.status == 0
    body = json.loads(ran.out)
    assert set(PLAIN) | set(NUMBERS) | {"numerical_error"} <= set(body)
    for key in NUMBERS:
        found = [value for value in leaves(body[key]) if value is not None]
        assert found
        assert all(isinstance(value, float) and math.isfinite(value) for value in found)
    bars = body["numerical_error"]
    assert set(bars) == set(NUMBERS)
    for key, bar in bars.items():
        bounded = {"virial": body[key]["virial"]} if key == "compressibility_factor" else body[key]
        assert shape(bar) == shape(bounded)
        assert all(0.0 <= value < 1e-2 * 1e4 for value in leaves(bar))
    assert "NaN" not in ran.out
    assert "Infinity" not in ran.out


def test_tables_name_every_pair_and_model(write, run):
    ran = run("state", write(TERNARY))
    assert (ran.status, ran.err) == (0, "")
    for center in "abc":
        for neighbor in "abc":
            assert f"{center} <- {neighbor}" in ran.out
    for words in ("Wilson (m = z/2 = 5)", "J/mol", "MPa, virial", "angstrom", "T = 300 K", "additive", "1.4 sigma_ij"):
        assert words in ran.out


def test_one_species_needs_no_fractions_and_gets_no_comparison(write, run):
    text = "[mixture]\ndiameter = [1.0]\nwell_depth = [1.0]\n[state]\ntemperature = 1.5\ndensity = 0.7\n"
    ran = run("state", write(text))
    assert ran.status == 0
    assert "Wilson" not in ran.out
    assert json.loads(run("state", write(text), "--json").out)["mole_fractions"] == [1.0]


@pytest.mark.parametrize("closure", ["MSA", "py", "hnc", "RHNC"])
def test_options_go_before_the_file(closure, write, run):
    body = json.loads(run("state", write(STATE), "--json", "--closure", closure, "--accuracy", "1e-3").out)
    assert (body["closure"], body["accuracy"]) == (closure.lower(), 1e-3)


def test_msa_with_a_weak_unlike_well(write, run):
    """R_12 = 0.858 for equal sizes and depths, k = 0.2, eta 0.40, T* = 1, x = 0.5 (own value, regression)."""
    body = json.loads(run("state", write(NO_SOLUTION), "--json", "--closure", "msa").out)
    assert body["neighbor_ratios"][0][1] == pytest.approx(0.858, abs=1e-3)
    other = json.loads(run("state", write(NO_SOLUTION), "--json", "--closure", "rhnc").out)
    assert other["neighbor_ratios"][0][1] != pytest.approx(0.858, abs=0.1)


def test_no_solution_is_status_3_in_every_form(tmp_path, write, run):
    path, figure, table = write(NO_SOLUTION), tmp_path / "g.png", tmp_path / "t.csv"
    ran = run("state", path, "--plot", figure, "--csv", table)
    assert ran.status == 3
    assert "no physical solution" in ran.err
    assert "no figure" in ran.err
    assert not figure.exists()
    rows = list(csv.reader(io.StringIO(table.read_text())))
    assert len(rows) == 5
    assert {len(row) for row in rows} == {len(rows[0])}
    body = json.loads(run("state", path, "--json").out)
    assert 1.3 < body["branch_end_temperature"] < 1.4, "the path ends there whatever was asked for"
    assert all(body[key] is None for key in (*NUMBERS, "numerical_error"))


def test_a_shell_without_neighbours_is_status_3(write, run):
    ran = run("state", write(GAS), "--json")
    assert ran.status == 3
    body = json.loads(ran.out)
    assert body["status"] == "no_shell"
    assert "another shell rule" in body["message"]
    assert "no answer" in run("state", write(GAS)).err


@pytest.mark.parametrize("names", ['["[/b]", "[red]"]', '["$A_", "_$B{"]', '[":smile:", "%s{0}"]', '["甲", "é"]'])
def test_names_are_printed_letter_by_letter(names, tmp_path, write, run):
    path = write(with_line(STATE, "names", f"names = {names}"))
    ran = run("state", path, "--csv", tmp_path / "t.csv")
    assert ran.status == 0
    first, second = json.loads(names)
    assert f"{first} <- {second}" in ran.out
    assert f",{first},{second}," in (tmp_path / "t.csv").read_text(encoding="utf-8")


def test_long_names_cost_no_digits(write, run):
    long = [40 * "x", 39 * "y" + "z"]
    short = run("state", write(without(STATE, "names")))
    ran = run("state", write(with_line(STATE, "names", f"names = {json.dumps(long)}")))
    digits = [line.split()[-4] for line in short.out.splitlines() if line.startswith(("1 <- 1 ", "2 <- 2 "))]
    assert len(digits) >= 2
    assert all(number in ran.out for number in digits)
    assert "…" not in ran.out


def refuse(*_arguments, **_keywords):
    raise AssertionError("nothing may be computed")


def test_outputs_are_checked_before_anything_is_computed(tmp_path, write, run, monkeypatch):
    monkeypatch.setattr(localcomp.report, "report_state", refuse)
    path = write(STATE)
    cases = {
        "does not exist": ("--csv", tmp_path / "nowhere" / "t.csv"),
        "is a directory": ("--csv", tmp_path),
        "is the input file": ("--csv", path),
        "File name too long": ("--csv", tmp_path / (300 * "x")),
        "does not exist ": ("--plot", path / "g.png"),
        "must end in .png, .svg, .pdf": ("--plot", tmp_path / "g.jpg"),
    }
    for words, (option, target) in cases.items():
        ran = run("state", path, option, target)
        assert (ran.status, ran.out) == (2, "")
        assert words.strip() in ran.err
        assert option in ran.err
        assert str(target) in ran.err
    assert path.read_text(encoding="utf-8") == STATE


def test_a_place_that_refuses_files_is_found_out_in_time(tmp_path, write, run, monkeypatch):
    def no_room(_self, mode="r", *_arguments, **_keywords):
        raise PermissionError(13, "Permission denied")

    path = write(STATE)
    monkeypatch.setattr(localcomp.report, "report_state", refuse)
    monkeypatch.setattr("pathlib.Path.open", no_room)
    ran = run("state", path, "--csv", tmp_path / "t.csv")
    assert ran.status == 2
    assert "--csv" in ran.err
    assert "cannot be written (Permission denied)" in ran.err


def test_the_check_of_an_output_leaves_no_trace(tmp_path, write, run):
    old = tmp_path / "old.csv"
    old.write_text("kept\n")
    bad = write(with_line(STATE, "temperature", "temperature = -1"))
    assert run("state", bad, "--csv", old, "--plot", tmp_path / "new.png").status == 2
    assert old.read_text() == "kept\n"
    assert not (tmp_path / "new.png").exists()


def test_a_defect_ends_with_a_sentence_not_a_traceback(write, run, monkeypatch):
    def broken(*_arguments):
        raise RuntimeError("something inside")

    monkeypatch.setattr(localcomp.report, "report_state", broken)
    ran = run("state", write(STATE))
    assert ran.status == 1
    assert "internal error: RuntimeError: something inside" in ran.err
    assert "LOCALCOMP_TRACEBACK" in ran.err


def test_an_interrupt_is_quiet(write, run, monkeypatch):
    def stop(*_arguments):
        raise KeyboardInterrupt

    monkeypatch.setattr(localcomp.report, "report_state", stop)
    ran = run("state", write(STATE))
    assert ran.status == 130
    assert "Traceback" not in ran.err


def test_table_and_figure_cannot_share_a_name(write, run, tmp_path):
    same, other = tmp_path / "out.png", tmp_path / "out.csv"
    ran = run("state", write(STATE), "--csv", same, "--plot", tmp_path / "." / "out.png")
    assert ran.status == 2
    assert str(same) in ran.err
    assert "--plot too" in ran.err
    assert not same.exists()
    assert run("state", write(STATE), "--csv", other, "--plot", same).status == 0
