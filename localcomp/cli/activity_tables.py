"""Tables of activity coefficients for a person to read."""

from __future__ import annotations

import math

import numpy as np

from localcomp.activity_parts import Activity
from localcomp.activity_report import MPA_PER_KELVIN_A3, IsothermReport, absolute
from localcomp.cli.state_tables import console, put, table, with_error
from localcomp.report import CAUTION
from localcomp.units import AVOGADRO_A3_PER_CM3

BASIS = {"packing": "constant packing fraction", "pressure": "constant pressure"}


def print_isotherm(report: IsothermReport) -> None:
    """One isotherm: ln gamma with parts and gaps, infinite dilution, excess functions, warnings."""
    out = console()
    request, units = report.request, report.request.units
    symbol = "T" if units.real else "kT"
    lead = f"{' + '.join(request.mixture.names)}, {symbol} = {request.temperature:g}{' K' if units.real else ''}"
    out.print(f"{lead}, {BASIS[request.basis]}, {request.closure.upper()}", style="bold")
    if report.found is None:
        return
    found = report.found
    if found.pressure is None:
        out.print(f"packing fraction {request.packing_fraction:.4g}, in pure liquids and mixtures alike")
    else:
        value = found.pressure * (MPA_PER_KELVIN_A3 if absolute(units) else 1.0)
        out.print(f"pressure {value:.5g} {'MPa' if absolute(units) else '(energy unit/length unit^3)'}")
    _infinite(report, found)
    _compositions(report, found)
    _excess(report, found)
    out.print(
        "KB - energy: Kirkwood-Buff route minus energy route. closures: largest distance of another closure. Both "
        "belong to the uncertainty; the last digit in brackets is the numerical error only.",
        style="dim",
    )
    for note in report.warnings:
        out.print(f"warning: {note}", style="yellow")
    out.print(CAUTION, style="dim")


def _number(value: float) -> str:
    return f"{round(value, 4) + 0.0:+.4f}" if math.isfinite(value) else "-"


def _fixed(value: float, digits: int) -> str:
    """A number with fixed decimals, "-" when there is none; zero has no sign."""
    return f"{round(value, digits) + 0.0:.{digits}f}" if math.isfinite(value) else "-"


def _infinite(report: IsothermReport, found: Activity) -> None:
    names = report.request.mixture.names
    title = "\nln gamma at infinite dilution" + (" in the rest of the mixture" if len(names) > 2 else "")
    made = table(title, "species", "ln gamma", "Flory-Huggins", "hard spheres", "attraction", "KB - energy", "closures")
    parts = found.parts
    value, bar, fh, hs, at, gap, spread = (
        report.split(rows)[1]
        for rows in (
            found.ln_gamma, found.numerical_error, parts.flory_huggins, parts.hard_sphere, parts.attraction,
            found.route_gap, report.closure_gap(),
        )
    )  # fmt: skip
    for i, name in enumerate(names):
        made.add_row(
            name, with_error(value[i], bar[i]) if math.isfinite(value[i]) else "-", _number(fh[i]), _number(hs[i]),
            _number(at[i]), _number(gap[i]), f"{spread[i]:.4f}" if math.isfinite(spread[i]) else "-",
        )  # fmt: skip
    put(console(), made)


def _compositions(report: IsothermReport, found: Activity) -> None:
    names = report.request.mixture.names
    made = table(
        "\nln gamma", *[f"x {name}" for name in names[: max(1, len(names) - 1)]], *[f"ln g {name}" for name in names],
        *[f"KB - energy {name}" for name in names], "closures", "x1 x2/S_cc" if len(names) == 2 else "stability",
    )  # fmt: skip
    spread = report.closure_gap()
    for n in range(report.listed):
        x = found.mole_fractions[n]
        row = [f"{v:.4g}" for v in x[: max(1, len(x) - 1)]]
        for value, bar in zip(found.ln_gamma[n], found.numerical_error[n], strict=True):
            row.append(with_error(value, bar) if math.isfinite(value) else "-")
        row += [_number(value) for value in found.route_gap[n]]
        widest = float(np.nanmax(spread[n])) if np.isfinite(spread[n]).any() else math.nan
        row.append(f"{widest:.4f}" if math.isfinite(widest) else "-")
        row.append(f"{found.inverse_scc[n]:.4f}" if math.isfinite(found.inverse_scc[n]) else "-")
        made.add_row(*row)
    put(console(), made)


def _excess(report: IsothermReport, found: Activity) -> None:
    units, temperature = report.request.units, report.request.temperature
    names = report.request.mixture.names
    real = absolute(units)
    columns = [f"A_ex, {units.energy_label}", f"U_ex, {units.energy_label}"]
    if found.basis == "pressure":
        columns = [
            f"G_ex, {units.energy_label}", f"H_ex, {units.energy_label}", "V_ex, cm3/mol" if real else "V_ex",
            "packing fraction",
        ]  # fmt: skip
    made = table("\nExcess functions", *[f"x {name}" for name in names[: max(1, len(names) - 1)]], *columns)
    digits = 1 if units.real else 5
    for n in range(report.listed):
        x = found.mole_fractions[n]
        row = [f"{v:.4g}" for v in x[: max(1, len(x) - 1)]]
        second = found.excess_energy if found.basis == "packing" else found.excess_enthalpy
        for value in (found.excess_free_energy[n], second[n]):
            energy = units.energy_out(float(value) * temperature)
            row.append(_fixed(energy, digits))
        if found.basis == "pressure":
            volume = float(found.excess_volume[n]) * (AVOGADRO_A3_PER_CM3 if real else 1.0)
            row += [_fixed(volume, 5), _fixed(float(found.packing_fraction[n]), 5)]
        made.add_row(*row)
    put(console(), made)
