"""The results of a sweep as a table: one row per state and pair; and what the class looks like."""

from __future__ import annotations

import csv
import io
import tempfile
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from localcomp.errors import BadInput
from localcomp.store import Store, StoreError
from localcomp.study import Study, read_study
from localcomp.sweep import is_solved


def stored_study(store: Store, directory: Path) -> Study:
    """The study whose results these are, from the copy kept with them.

    Raises
    ------
    StoreError
        If there is none (the sweep never began).
    """
    text = store.read_note("study")
    if text is None:
        raise StoreError(f"{store.path}: holds no study; run `localcomp sweep STUDY --out {directory}` first")
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "study.toml"
        path.write_text(text, encoding="utf-8")
        try:
            return read_study(path)
        except BadInput as error:
            found = "; ".join(f"{p.key} {p.allowed}" for p in error.problems)
            raise StoreError(f"{store.path}: the study kept there is damaged ({found})") from None


def header(study: Study) -> list[str]:
    """Column names with units."""
    length, energy = study.units.length_label, study.units.energy_label
    labels = label_names(study)
    return [
        "closure", "status", *labels, f"temperature ({study.units.temperature_label})", "packing_fraction",
        "mole_fractions", "center", "neighbor", f"diameter ({length})", f"well_depth ({study.units.temperature_label})",
        f"shell_radius ({length})", "coordination_number",
        "coordination_number_error", "local_mole_fraction", "neighbor_ratio", "neighbor_ratio_error", "contact_value",
        f"internal_energy ({energy})", "virial_z", "inverse_compressibility", "message",
    ]  # fmt: skip


def label_names(study: Study) -> list[str]:
    """Names of the study's own labels, in order of appearance."""
    names: dict[str, None] = {}
    for case in study.cases:
        names.update(dict.fromkeys(case.labels))
    return list(names)


def rows_csv(study: Study, results: list[dict[str, Any] | None]) -> str:
    """RFC 4180 text; states not solved yet have status "missing", failed ones their reason."""
    buffer = io.StringIO()
    writer = csv.writer(buffer, lineterminator="\r\n")
    writer.writerow(header(study))
    labels = label_names(study)
    for case, result in zip(study.cases, results, strict=True):
        status = "missing" if result is None else result["status"]
        message = "" if result is None or is_solved(result) else result.get("message", "")
        head = [case.closure, status, *(case.labels.get(name, "") for name in labels),
                repr(case.state.temperature), repr(case.mixture.packing_fraction(case.state)),
                " ".join(repr(x) for x in case.state.mole_fractions)]  # fmt: skip
        names = case.mixture.names
        for i, center in enumerate(names):
            for j, neighbor in enumerate(names):
                numbers: list[Any] = [""] * 10
                if result is not None and is_solved(result):
                    numbers = [
                        *(
                            repr(result[key][i][j])
                            for key in (
                                "shell_radius", "coordination_numbers", "coordination_errors", "local_mole_fractions",
                                "neighbor_ratios", "ratio_errors", "contact_values",
                            )
                        ),
                        repr(study.units.energy_out(result["internal_energy"])),
                        repr(result["virial_z"]),
                        repr(result["inverse_compressibility"]),
                    ]  # fmt: skip
                pair = (
                    repr(float(case.mixture.pairs.diameter[i, j])),
                    repr(float(case.mixture.pairs.well_depth[i, j])),
                )
                writer.writerow([*head, center, neighbor, *pair, *numbers, message])
    return buffer.getvalue()


@dataclass(frozen=True)
class Summary:
    """A class at a glance.

    Attributes
    ----------
    counts : dict
        States by status.
    ranges : list of (name, smallest, median, largest)
        Of neighbour ratios and other numbers over the solved states.
    largest_error : float
        Worst numerical error of a coordination number, relative.
    failures : dict
        States without a solution by closure and status.
    """

    counts: dict[str, int]
    ranges: list[tuple[str, float, float, float]]
    largest_error: float
    failures: dict[tuple[str, str], int]


def summary(study: Study, results: list[dict[str, Any] | None]) -> Summary:
    """Counts and ranges over the class."""
    counts: dict[str, int] = {}
    failures: dict[tuple[str, str], int] = {}
    series: dict[str, list[float]] = {}
    worst = 0.0
    for case, result in zip(study.cases, results, strict=True):
        status = "missing" if result is None else str(result["status"])
        counts[status] = counts.get(status, 0) + 1
        if result is None or not is_solved(result):
            failures[case.closure, status] = failures.get((case.closure, status), 0) + 1
            continue
        worst = max(worst, result["relative_error"])
        size = len(result["neighbor_ratios"])
        if size <= 3:
            for i in range(size):
                for j in range(size):
                    if i != j:
                        series.setdefault(f"neighbour ratio R_{i + 1}{j + 1}", []).append(
                            result["neighbor_ratios"][i][j]
                        )
        series.setdefault(f"internal energy, {study.units.energy_label}", []).append(
            study.units.energy_out(result["internal_energy"])
        )
        series.setdefault("Z, virial route", []).append(result["virial_z"])
    ranges = [(name, float(np.min(v)), float(np.median(v)), float(np.max(v))) for name, v in series.items()]
    return Summary(counts, ranges, worst, failures)
