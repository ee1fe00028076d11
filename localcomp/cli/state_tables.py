"""Tables of one state for a person to read."""

from __future__ import annotations

import math

from rich.cells import cell_len
from rich.console import Console
from rich.table import Table
from rich.text import Text

from localcomp.models import LATTICE_COORDINATION
from localcomp.report import CAUTION, StateReport, pressure_mpa

WIDTH = 100
LABEL = 32
SMALL = 1e-4
"""Smaller numbers are written with a power of ten."""
MOST_DIGITS = 12


def console() -> Console:
    """A console that keeps tables whole when output goes to a file, and prints names letter by letter."""
    plain = Console(highlight=False, markup=False, emoji=False)
    return plain if plain.is_terminal else Console(highlight=False, markup=False, emoji=False, width=WIDTH)


def with_error(value: float, bar: float) -> str:
    """A number with its error bar in its last digit: 2.97839(2) is 2.97839 +- 0.00002."""
    if not bar > 0.0:
        return f"{value:.6g}"
    if bar < abs(value) < SMALL:
        power = math.floor(math.log10(abs(value)))
        return f"{with_error(value / 10.0**power, bar / 10.0**power)}e{power:+03d}"
    if bar < 10.0**-MOST_DIGITS:
        return f"{value:.{MOST_DIGITS}g}"
    digits = 0
    while digits < MOST_DIGITS and bar * 10**digits < 0.95:
        digits += 1
    value = round(value, digits) + 0.0  # no minus before a zero
    return f"{value:.{digits}f}({max(math.ceil(bar * 10**digits - 0.05), 1)})"


def plain(value: float, decimals: int = 4) -> str:
    """A number without error bar: a few decimals, or three digits when those would mislead."""
    if not math.isfinite(value):
        return "-"
    return f"{value:.{decimals}f}" if value == 0.0 or 1e-2 <= abs(value) < 1e5 else f"{value:.3g}"


def table(title: str, *columns: str) -> Table:
    """A table in the house style: light rules, right-aligned numbers."""
    made = Table(title=title, title_justify="left", title_style="bold", box=None, pad_edge=False, padding=(0, 2, 0, 0))
    for n, column in enumerate(columns):
        made.add_column(column, justify="left" if n == 0 else "right", overflow="fold")
    return made


def put(out: Console, made: Table) -> None:
    """Print a table; when it is too wide its headers wrap and labels beyond `LABEL`, numbers never do."""
    for n, column in enumerate(made.columns):
        widest = max((cell_len(str(cell)) for cell in column.cells), default=0)
        column.min_width = min(widest, LABEL) if n == 0 else widest
    out.print(made, crop=False)


def print_state(report: StateReport) -> None:
    """Everything about one state under one closure."""
    out = console()
    request, solution = report.request, report.solution
    units = request.units
    fractions = ", ".join(
        f"{name} {x:.6g}" for name, x in zip(request.mixture.names, request.state.mole_fractions, strict=True)
    )
    head = f"{solution.closure.title} ({request.closure}) at "
    head += f"T = {request.state.temperature:g} K" if units.real else f"kT = {request.state.temperature:g}"
    head += f", packing fraction {request.mixture.packing_fraction(request.state):.5g}, mole fractions: {fractions}"
    out.print(Text(head))
    if report.usable:
        _neighbors(out, report)
        _statements(out, report)
        _shells(out, report)
        _thermodynamics(out, report)
        stats = solution.stats
        out.print(
            f"\n{solution.status.value}; {stats.steps} steps, {stats.grid_points} grid points of "
            f"{stats.spacing * solution.length:.3g} {units.length_label}, {1e3 * stats.seconds:.0f} ms; "
            f"2.978(2) is 2.978 ± 0.002, the numerical error at the accuracy asked ({request.accuracy:g}), not the "
            "closure's own error."
        )
    for warning in report.warnings:
        out.print(f"warning: {warning}", style="yellow")
    if report.usable:
        out.print(CAUTION, style="dim")


def _neighbors(out: Console, report: StateReport) -> None:
    found = report.neighbors
    assert found is not None
    names = report.request.mixture.names
    unit = report.request.units.length_label
    made = table(
        f"\nNeighbours in the first shell (shell rule: {found.rule.description})",
        "centre <- neighbour", f"shell radius / {unit}", "N_ij", "local fraction X_ij", "ratio R_ij", "g at contact",
    )  # fmt: skip
    errors = report.solution.errors
    for i, center in enumerate(names):
        for j, neighbor in enumerate(names):
            made.add_row(
                f"{center} <- {neighbor}",
                f"{found.radius[i, j]:.5g}",
                with_error(found.coordination_numbers[i, j], found.coordination_errors[i, j]),
                with_error(found.local_mole_fractions[i, j], found.fraction_errors[i, j]),
                "1" if i == j else with_error(found.neighbor_ratios[i, j], found.ratio_errors[i, j]),
                with_error(report.solution.contact_values[i, j], errors.contact[i, j]),
            )
    put(out, made)
    if len(names) > 1:
        out.print("R_ij = (N_ij/N_ii)/(x_j/x_i): 1 when the centre i does not care.", style="dim")


def _statements(out: Console, report: StateReport) -> None:
    names = report.request.mixture.names
    if len(names) < 2 or not report.statements:
        return
    found = report.neighbors
    assert found is not None
    pairs = [(i, j) for i in range(len(names)) for j in range(len(names)) if i != j]
    for start in range(0, len(pairs), 2):
        chosen = pairs[start : start + 2]
        heads = [head for i, j in chosen for head in (f"R {names[i]} <- {names[j]}", "stated/found")]
        title = "\nWhat models state for these energies" + (", continued" if start else "")
        made = table(title, "model (energy reading)", *heads)
        made.add_row("found", *[cell for i, j in chosen for cell in (plain(found.neighbor_ratios[i, j]), "")])
        for s in report.statements:
            cells = [cell for i, j in chosen for cell in (plain(s.stated[i, j]), plain(s.off[i, j], 3))]
            made.add_row(f"{s.model.label} ({s.reading.label(LATTICE_COORDINATION)})", *cells)
        put(out, made)
    out.print(
        "Reading: the energy a parameter stands for, one contact (m = 1) or all contacts of a molecule (m = z/2, "
        "z = 10). stated/found = 1: the model's statement holds.",
        style="dim",
    )


def _shells(out: Console, report: StateReport) -> None:
    names = report.request.mixture.names
    sensitivity = report.sensitivity
    if len(names) < 2 or sensitivity is None or len(sensitivity.results) < 2:
        return
    rules = [result.rule.description for result in sensitivity.results]
    made = table("\nDoes the ratio hinge on the shell rule?", "R_ij", *rules, "spread")
    for i, center in enumerate(names):
        for j, neighbor in enumerate(names):
            if i != j:
                values = [
                    f"{plain(r.neighbor_ratios[i, j])}  ({r.radius[i, j]:.3g}/{r.radius[i, i]:.3g})"
                    for r in sensitivity.results
                ]
                made.add_row(f"{center} <- {neighbor}", *values, f"{sensitivity.spread[i, j]:.4f}")
    put(out, made)
    out.print(
        f"In brackets: shell radius of the unlike / of the like pair, {report.request.units.length_label}. "
        "The first minimum of g may lie inside a wide well.",
        style="dim",
    )


def _thermodynamics(out: Console, report: StateReport) -> None:
    solution, units = report.solution, report.request.units
    errors = solution.errors
    made = table("\nThermodynamics", "quantity", "value", "route or unit")
    energy = units.energy_out(solution.internal_energy)
    bar = units.energy_out(float(errors.energy) * report.request.state.temperature)
    made.add_row("residual energy U/N", with_error(energy, bar), units.energy_label)
    made.add_row("Z = P/(rho kT)", with_error(solution.virial_z, float(errors.virial)), "virial")
    if report.route is not None:
        made.add_row("Z = P/(rho kT)", f"{report.route.z:.4f}", "energy")
        made.add_row("  gap between these routes", f"{solution.virial_z - report.route.z:+.4f}", "virial - energy")
    for label, z in (("virial", solution.virial_z), ("energy", report.route.z if report.route else None)):
        pressure = pressure_mpa(report, z) if z is not None else None
        if pressure is not None:
            made.add_row("pressure", f"{pressure:.4g}", f"MPa, {label}")
    inverse = with_error(solution.inverse_compressibility, float(errors.inverse_compressibility))
    made.add_row("1/(rho kT kappa_T)", inverse, "compressibility")
    made.add_row("1/(rho kT kappa_T)", f"{solution.virial_inverse_compressibility:.4f}", "virial")
    made.add_row("  gap between these routes", f"{solution.route_gap:+.4f}", "virial - compressibility")
    x = report.request.state.mole_fractions
    if len(x) == 2 and min(x) > 0.0:
        ratio = solution.concentration_structure_factor[0, 0] / (x[0] * x[1])
        made.add_row("S_cc(0)/(x1 x2)", f"{ratio:.4f}", "1 if ideal, infinite at the spinodal")
    put(out, made)
    out.print("The gaps are the closure's own inconsistency: zero for an exact theory.", style="dim")


def print_comparison(reports: list[StateReport]) -> None:
    """All closures side by side."""
    out = console()
    names = reports[0].request.mixture.names
    units = reports[0].request.units
    made = table("\nAll closures side by side", "quantity", *[r.request.closure for r in reports])

    def row(label: str, values: list[float | None], digits: int = 4) -> None:
        made.add_row(label, *["-" if v is None else f"{v:.{digits}f}" for v in values])

    for i, center in enumerate(names):
        for j, neighbor in enumerate(names):
            row(f"N {center} <- {neighbor}", [r.neighbors.coordination_numbers[i, j] if r.neighbors else None
                                              for r in reports])  # fmt: skip
    for i, center in enumerate(names):
        for j, neighbor in enumerate(names):
            if i != j:
                row(f"R {center} <- {neighbor}", [r.neighbors.neighbor_ratios[i, j] if r.neighbors else None
                                                  for r in reports])  # fmt: skip
    usable = [r.solution if r.usable else None for r in reports]
    digits = 1 if units.real else 4
    row(f"U/N, {units.energy_label}", [units.energy_out(s.internal_energy) if s else None for s in usable], digits)
    row("Z, virial route", [s.virial_z if s else None for s in usable])
    row("Z, energy route", [r.route.z if r.route else None for r in reports])
    row("1/(rho kT kappa_T), compressibility", [s.inverse_compressibility if s else None for s in usable])
    row("  gap to the virial route", [s.route_gap if s else None for s in usable])
    put(out, made)
    for r in reports:
        if not r.usable:
            out.print(f"{r.request.closure}: {r.message}", style="yellow")
