"""`localcomp components`: what is known about simple components, and where it comes from."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer


def components(
    name: Annotated[str | None, typer.Argument(metavar="NAME", help="One component; without it all.")] = None,
    file: Annotated[
        Path | None, typer.Option(metavar="FILE", help="Components of your own (TOML), beside the bundled ones.")
    ] = None,
    json: Annotated[bool, typer.Option("--json", help="Print one JSON object and nothing else.")] = False,
) -> None:
    """List simple components: measured liquids to calibrate on, and square wells from second virial coefficients."""
    from localcomp.cli.outputs import print_json
    from localcomp.cli.state_tables import console, put, table
    from localcomp.components import component_json, component_named, load_components

    found = load_components(file)
    chosen = list(found.values()) if name is None else [component_named(name, found)]
    if json:
        print_json({"components": [component_json(component) for component in chosen]})
        return
    out = console()
    if name is None:
        made = table("Components", "name", "liquid at, K", "sigma, angstrom", "range", "eps/k, K", "B2 fitted over, K")
        for component in chosen:
            virial = component.virial
            cells = ["-"] * 4
            if virial is not None:
                low, high = virial.temperatures
                cells = [f"{virial.diameter:.4f}", f"{virial.well_range:.4f}", f"{virial.well_depth:.1f}",
                         f"{low:g} to {high:g}"]  # fmt: skip
            at = ", ".join(f"{point.temperature:g}" for point in component.liquids) or "-"
            made.add_row(component.name, at, *cells)
        put(out, made)
    else:
        (component,) = chosen
        made = table(f"{component.name}: saturated liquid", "T, K", "V, cm3/mol", "U residual, J/mol", "P, kPa")
        for point in component.liquids:
            made.add_row(f"{point.temperature:g}", f"{point.molar_volume:g}", f"{point.residual_energy:g}",
                         f"{point.pressure:g}")  # fmt: skip
        put(out, made)
        for source in dict.fromkeys(point.source for point in component.liquids):
            out.print(f"source: {source}", style="dim")
        if component.virial is not None:
            v = component.virial
            out.print(
                f"\nSquare well of the gas: sigma {v.diameter:.4f} angstrom, range {v.well_range:.4f}, eps/k "
                f"{v.well_depth:.1f} K (B2 = {v.a:g} - {v.b:g} exp({v.c:g}/T) cm3/mol)"
            )
            out.print(f"source: {v.source}", style="dim")
    out.print(
        "sigma, range and eps/k here reproduce the gas's second virial coefficient; they put the liquid inside the "
        "model's two-phase region. For the liquid, calibrate on its measured numbers (localcomp calibrate); those "
        "parameters do not give the gas's B2. Never mix the two.",
        style="dim",
    )
