"""What a fit writes: fits.csv, implied_ratios.csv, ternary.csv, and the same as plain values."""

from __future__ import annotations

import csv
import io
from collections import Counter
from typing import Any

import numpy as np

from localcomp.fitpair import BAD_RATIO, GOOD_FIT, Misfit, ModelTest, PairResult
from localcomp.fitstudy import FitReport
from localcomp.models import ActivityModel, Reading
from localcomp.report import CAUTION, clean

PARTS = ("dilution", "other_temperature", "other_density", "ratios")


def _labels(report: FitReport) -> list[str]:
    return list(dict.fromkeys(name for pair in report.pairs for name in pair.task.labels))


def _number(value: float) -> str:
    return repr(float(value)) if np.isfinite(value) else ""


def _write(header: list[str], rows: list[list[str]]) -> str:
    buffer = io.StringIO()
    writer = csv.writer(buffer, lineterminator="\r\n")
    writer.writerow(header)
    writer.writerows(rows)
    return buffer.getvalue()


def _head(pair: PairResult, labels: list[str]) -> list[str]:
    return [*(str(pair.task.labels.get(name, "")) for name in labels), repr(pair.task.packing_fraction)]


def fits_csv(report: FitReport) -> str:
    """One row per pair, packing fraction and model; ln gamma is dimensionless."""
    labels, energy = _labels(report), "K" if report.study.units.real else "energy unit"
    header = [
        *labels, "packing_fraction", "model", "parameter_1", f"value_1 ({energy})", f"standard_error_1 ({energy})",
        "multiplicity_1", "parameter_2", f"value_2 ({energy})", f"standard_error_2 ({energy})", "multiplicity_2",
        "correlation", "minima", "rms_fit", "largest_fit",
        *(f"rms_unfitted, {reading.label()}" for reading in Reading),
        *(f"{kind}_{part}" for part in PARTS for kind in ("rms", "largest")),
        "splits_at_lowest_temperature", "verdict",
    ]  # fmt: skip
    rows = []
    for pair in report.pairs:
        if pair.reason:
            rows.append([*_head(pair, labels), *[""] * (len(header) - len(labels) - 2), pair.reason])
            continue
        for test in pair.tests:
            fit = test.regression
            names = fit.model.adjustable.value
            cells: list[str] = []
            for n in range(2):
                cells += (
                    [names[n], _number(fit.values[n]), _number(fit.standard_errors[n]), _number(test.multiplicity[n])]
                    if n < len(names)
                    else [""] * 4
                )
            cells += [_number(fit.correlation), str(fit.minima), _number(fit.rms), _number(fit.largest)]
            cells += [_number(test.unfitted[reading].rms) for reading in Reading]
            for part in PARTS:
                misfit: Misfit = getattr(test, part)
                cells += [_number(misfit.rms), _number(misfit.largest)]
            cells += ["; ".join(f"{a:.3f} to {b:.3f}" for a, b in test.splits), test.verdict]
            rows.append([*_head(pair, labels), fit.model.label, *cells])
    return _write(header, rows)


def implied_csv(report: FitReport) -> str:
    """One row per state, model and direction: the true ratio and the one that the fitted energies imply."""
    labels = _labels(report)
    header = [
        *labels, "packing_fraction", f"temperature ({report.study.units.temperature_label})", "mole_fraction_1",
        "model", "center", "neighbor", "true_ratio", "implied_ratio",
    ]  # fmt: skip
    rows = []
    for pair in report.pairs:
        names = pair.task.mixture.names
        for test in pair.tests:
            for n, (t, x) in enumerate(zip(pair.temperature, pair.x, strict=True)):
                for column, (i, j) in enumerate(((0, 1), (1, 0))):
                    rows.append(
                        [*_head(pair, labels), _number(t), _number(x), test.regression.model.label, names[i], names[j],
                         _number(pair.ratios[n, column]), _number(test.implied[n, column])]
                    )  # fmt: skip
    return _write(header, rows)


def ternary_csv(report: FitReport) -> str:
    """One row per model, composition and species of the ternary."""
    header = ["mixture", "model", "mole_fractions", "species", "true_ln_gamma", "predicted_ln_gamma"]
    rows = []
    for test in report.ternaries:
        for n, x in enumerate(test.mole_fractions):
            fractions = " ".join(repr(float(v)) for v in x)
            for i in range(len(x)):
                rows.append(
                    [report.ternary_mixture, test.model.label, fractions, str(i + 1), _number(test.truth[n, i]),
                     _number(test.predicted[n, i])]
                )  # fmt: skip
    return _write(header, rows)


def by_model(report: FitReport) -> dict[ActivityModel, list[ModelTest]]:
    """All pairs' tests of each model."""
    out: dict[ActivityModel, list[ModelTest]] = {}
    for pair in report.pairs:
        for test in pair.tests:
            out.setdefault(test.regression.model, []).append(test)
    return out


def summary(report: FitReport) -> list[dict[str, Any]]:
    """One entry per model over the study."""
    ternary = {test.model: test.misfit for test in report.ternaries}
    out = []
    for model, tests in by_model(report).items():
        verdicts = Counter(test.verdict for test in tests)
        off = [test.ratios.largest for test in tests if np.isfinite(test.ratios.largest)]
        entry: dict[str, Any] = {
            "model": model.label,
            "pairs": len(tests),
            "rms_fit": {"median": _median(test.regression.rms for test in tests),
                        "largest": max(test.regression.rms for test in tests)},
            "rms_unfitted": {r.label(): _median(test.unfitted[r].rms for test in tests) for r in Reading},
            "largest_ratio_error": max(off, default=None),
            "verdicts": dict(verdicts),
        }  # fmt: skip
        for part in PARTS[:3]:
            entry[f"rms_{part}"] = _median(getattr(test, part).rms for test in tests)
        if model in ternary:
            entry["rms_ternary"] = ternary[model].rms
        out.append(entry)
    return out


def _median(values: Any) -> float:
    found = np.array([v for v in values if np.isfinite(v)])
    return float(np.median(found)) if found.size else float("nan")


def as_json(report: FitReport) -> dict[str, Any]:
    """The fits as plain values."""
    body = {
        "closure": report.study.closures[0],
        "basis": "constant packing fraction",
        "good_fit_rms": GOOD_FIT,
        "wrong_ratio_ln": BAD_RATIO,
        "models": summary(report),
        "pairs": [
            {
                **pair.task.labels,
                "packing_fraction": pair.task.packing_fraction,
                "temperatures": list(pair.task.temperatures),
                "temperatures_left_out": list(pair.left_out),
                "reason": pair.reason,
                "numerical_error": pair.numerical_error,
                "fits": [
                    {
                        "model": test.regression.model.label,
                        "parameters": dict(
                            zip(test.regression.model.adjustable.value, test.regression.values.tolist(), strict=True)
                        ),
                        "standard_errors": test.regression.standard_errors.tolist(),
                        "correlation": test.regression.correlation,
                        "rms": test.regression.rms,
                        "largest": test.regression.largest,
                        "multiplicity": test.multiplicity.tolist(),
                        "ratio_error": test.ratios.largest,
                        "splits": [list(pair) for pair in test.splits],
                        "verdict": test.verdict,
                    }
                    for test in pair.tests
                ],
            }
            for pair in report.pairs
        ],
        "ternary": {
            "mixture": report.ternary_mixture,
            "models": [
                {"model": t.model.label, "rms": t.misfit.rms, "largest": t.misfit.largest} for t in report.ternaries
            ],
        },
        "caution": CAUTION,
    }
    cleaned = clean(body)
    assert isinstance(cleaned, dict)
    return cleaned
