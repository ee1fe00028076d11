"""`localcomp calibrate`: a pure liquid turned into a sphere with a square well."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer


def calibrate(
    file: Annotated[
        Path, typer.Argument(metavar="FILE", help="Pure-liquid file (TOML); `localcomp new DIR` writes one.")
    ],
    json: Annotated[bool, typer.Option("--json", help="Print one JSON object and nothing else.")] = False,
) -> None:
    """Find sigma and eps/k of a pure liquid from its molar volume, energy and pressure."""
    from localcomp.calibrate import calibrate as find
    from localcomp.calibrate import calibration_json, read_liquid
    from localcomp.cli.outputs import print_json

    liquid = read_liquid(file)
    result = find(liquid)
    if json:
        print_json(calibration_json(result))
        return
    from localcomp.cli.state_tables import console, put, table

    out = console()
    out.print(
        f"{liquid.name} at {liquid.temperature:g} K, well range {liquid.well_range:g}, closure {liquid.closure} "
        f"(data: {liquid.source})"
    )
    made = table("\nSquare well", "parameter", "value", "unit")
    made.add_row("diameter sigma", f"{result.diameter:.5f}", "angstrom")
    made.add_row("well depth eps/k", f"{result.well_depth:.4f}", "K")
    made.add_row("reduced temperature T* = kT/eps", f"{result.reduced_temperature:.5f}", "")
    made.add_row("packing fraction eta", f"{result.packing_fraction:.5f}", "")
    put(out, made)
    made = table("\nConditions", "quantity", "measured", "reached", "unit")
    made.add_row("residual energy", f"{liquid.residual_energy:.2f}", f"{result.residual_energy:.2f}", "J/mol")
    made.add_row("pressure, energy route", f"{liquid.pressure:.3f}", f"{result.pressure:.3f}", "kPa")
    made.add_row("pressure, virial route", "", f"{result.virial_pressure:.1f}", "kPa")
    put(out, made)
    out.print(
        "The virial route is not fitted; its distance is the closure's own inconsistency. These parameters describe "
        "the liquid at this temperature; they do not give the gas's second virial coefficient.",
        style="dim",
    )
