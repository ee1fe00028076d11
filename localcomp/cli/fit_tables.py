"""Tables of fits for a person to read."""

from __future__ import annotations

import math

from localcomp.cli.state_tables import console, put, table
from localcomp.fitpair import BAD_RATIO, GOOD_FIT
from localcomp.fitstudy import FitReport
from localcomp.fittables import summary
from localcomp.report import CAUTION


def _number(value: object) -> str:
    return f"{value:.3f}" if isinstance(value, float) and math.isfinite(value) else "-"


def print_fits(report: FitReport) -> None:
    """Quality of fit, predictions outside it, implied neighbours, and what both say together."""
    out = console()
    entries = summary(report)
    made = table(
        "\nln gamma: root mean square errors, medians over the pairs", "model", "fitted", "m = 1", "m = z/2", "dilute",
        "warmer", "density", "ternary",
    )  # fmt: skip
    for entry in entries:
        raw = list(entry["rms_unfitted"].values())
        made.add_row(
            entry["model"], _number(entry["rms_fit"]["median"]), *map(_number, raw), _number(entry["rms_dilution"]),
            _number(entry["rms_other_temperature"]), _number(entry["rms_other_density"]),
            _number(entry.get("rms_ternary")),
        )  # fmt: skip
    put(out, made)
    out.print(
        "m = 1, m = z/2: true energies put in, nothing fitted. dilute, warmer, density, ternary: predicted with the "
        "fitted energies.",
        style="dim",
    )
    kinds = ("right for the right reason", "right for the wrong reason", "does not fit")
    heads = ("model", "right reason", "wrong reason", "no fit", "worst ln R error")
    made = table("\nPairs by what the fit implies", *heads)
    for entry in entries:
        made.add_row(entry["model"], *(str(entry["verdicts"].get(kind, 0)) for kind in kinds),
                     _number(entry["largest_ratio_error"]))  # fmt: skip
    put(out, made)
    out.print(
        f"A fit is good up to {GOOD_FIT:g} in ln gamma (rms). It is right for the wrong reason when it is good and the "
        f"neighbour ratios its energies imply are off by more than {BAD_RATIO:g} in ln R.",
        style="dim",
    )
    out.print(f"ternary: {report.ternary_mixture}", style="dim", markup=False)
    for pair in report.pairs:
        if pair.reason:
            names = " + ".join(pair.task.mixture.names)
            out.print(f"{names}, eta {pair.task.packing_fraction:g}: {pair.reason}", style="yellow", markup=False)
        elif pair.left_out:
            names, cold = " + ".join(pair.task.mixture.names), ", ".join(f"{t:g}" for t in pair.left_out)
            out.print(
                f"{names}, eta {pair.task.packing_fraction:g}: nothing to fit at {cold}", style="yellow", markup=False
            )
    out.print(CAUTION, style="dim")
