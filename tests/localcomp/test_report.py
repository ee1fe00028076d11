"""What a report writes: CSV that reads back exactly, JSON without numbers that do not exist."""

from __future__ import annotations

import csv
import io
import json
import math

import numpy as np
import pytest

from localcomp.cli.state_tables import plain, with_error
from localcomp.inputs import read_state
from localcomp.report import CAUTION, as_csv, as_json, clean, compare_closures, report_state
from ozsolve import CLOSURES
from tests.localcomp.state_files import NO_SOLUTION, STATE, TERNARY, with_line

COLUMNS = [
    "closure", "status", "center", "neighbor", "shell_radius", "coordination_number", "coordination_number_error",
    "local_mole_fraction", "local_mole_fraction_error", "neighbor_ratio", "neighbor_ratio_error", "contact_value",
    "contact_value_error",
]  # fmt: skip


def rows_of(text: str) -> list[dict[str, str]]:
    rows = list(csv.DictReader(io.StringIO(text)))
    assert all(None not in row and None not in row.values() for row in rows), "every row has every column"
    return rows


@pytest.mark.parametrize("text", [STATE, TERNARY], ids=["binary", "ternary"])
def test_csv_reads_back_exactly(text, write):
    report = report_state(read_state(write(text)))
    found, names = report.neighbors, report.request.mixture.names
    assert found is not None
    rows = rows_of(as_csv([report]))
    assert list(rows[0])[: len(COLUMNS)] == COLUMNS
    assert len(rows) == len(names) ** 2
    tables = {
        "shell_radius": found.radius,
        "coordination_number": found.coordination_numbers,
        "coordination_number_error": found.coordination_errors,
        "local_mole_fraction": found.local_mole_fractions,
        "local_mole_fraction_error": found.fraction_errors,
        "neighbor_ratio": found.neighbor_ratios,
        "neighbor_ratio_error": found.ratio_errors,
        "contact_value": report.solution.contact_values,
        "contact_value_error": report.solution.errors.contact,
        **{f"stated ratio: {s.model.label}; {s.reading.label(10.0)}": s.stated for s in report.statements},
    }
    assert set(rows[0]) == set(tables) | set(COLUMNS[:4])
    for row in rows:
        i, j = names.index(row["center"]), names.index(row["neighbor"])
        for column, table in tables.items():
            assert float(row[column]) == table[i, j], column


def test_csv_of_all_closures_keeps_the_failed_ones(write):
    reports = compare_closures(read_state(write(NO_SOLUTION)))
    assert [report.request.closure for report in reports] == list(CLOSURES)
    rows = rows_of(as_csv(reports))
    assert len(rows) == 4 * len(CLOSURES)
    for row in rows:
        assert (row["coordination_number"] == "") == (row["closure"] == "py")
        assert (row["status"] == "solved") == (row["closure"] != "py")


def test_names_with_commas_and_quotes_survive(write):
    text = with_line(STATE, "names", "names = ['2,3-butane', 'say \"x\"']")
    rows = rows_of(as_csv([report_state(read_state(write(text)))]))
    assert {row["center"] for row in rows} == {"2,3-butane", 'say "x"'}


def test_json_numbers_are_those_of_the_solution(write):
    report = report_state(read_state(write(STATE)))
    body = json.loads(json.dumps(as_json(report), allow_nan=False))
    assert body["compressibility_factor"]["virial"] == report.solution.virial_z
    assert report.route is not None
    assert body["compressibility_factor"]["energy"] == report.route.z
    assert body["inverse_compressibility"] == report.solution.inverse_compressibility
    assert body["caution"] == CAUTION
    for statement in body["statements"]:
        product = np.array(statement["stated_over_found"]) * np.array(body["neighbor_ratios"])
        assert product == pytest.approx(np.array(statement["neighbor_ratios"]))


def test_numbers_that_do_not_exist_are_null():
    dirty = {"a": np.array([1.0, np.nan]), "b": (math.inf, 2), "c": [{"d": np.float64("-inf")}], "e": "NaN", "f": True}
    assert clean(dirty) == {"a": [1.0, None], "b": [None, 2], "c": [{"d": None}], "e": "NaN", "f": True}


def test_a_liquid_under_tension_is_warned_of(write):
    text = with_line(
        with_line(STATE, "temperature", "temperature = 1.3"), "packing_fraction", "packing_fraction = 0.33"
    )
    report = report_state(read_state(write(text)))
    assert report.route is not None
    assert (report.route.z < 0.0) == any("tension" in note for note in report.warnings)
    assert report.route.z < 0.0


@pytest.mark.parametrize(
    ("value", "bar", "shown"),
    [
        (2.978391, 0.0000173, "2.97839(2)"),
        (2.978391, 0.0, "2.97839"),
        (1234.4, 12.0, "1234(12)"),
        (-6.795, 0.002, "-6.795(2)"),
        (0.5, math.nan, "0.5"),
        (1.0, 1e-12, "1.000000000000(1)"),
        (1.0, 1e-18, "1"),
        (2.5e-12, 3e-17, "2.50000(3)e-12"),
        (-2.5e-12, 3e-14, "-2.50(3)e-12"),
        (-4e-16, 4.0e-6, "0.000000(4)"),
        (3e-7, 4.0e-6, "0.000000(4)"),
    ],
)
def test_error_bars_stand_in_the_last_digit(value, bar, shown):
    assert with_error(value, bar) == shown


@pytest.mark.parametrize(
    ("value", "shown"),
    [(0.62201, "0.6220"), (0.0, "0.0000"), (3.2e-5, "3.2e-05"), (2.7e43, "2.7e+43"), (math.nan, "-")],
)
def test_plain_numbers_never_mislead(value, shown):
    assert plain(value) == shown
