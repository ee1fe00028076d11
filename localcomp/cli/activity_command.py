"""`localcomp activity`: activity coefficients of the square-well mixture."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from localcomp.errors import BadInput, Problem

if TYPE_CHECKING:
    from localcomp.activity_report import IsothermReport

FIGURE_SUFFIXES = (".png", ".svg", ".pdf")
MOST_PANELS = 12
NOTHING_AVAILABLE = 3


def activity(
    file: Annotated[Path, typer.Argument(metavar="FILE|STUDY", help="State file or study file (TOML).")],
    basis: Annotated[
        str, typer.Option(help="What pure liquids and mixture share: packing (fraction) or pressure.")
    ] = "packing",
    pressure: Annotated[
        float | None,
        typer.Option(
            help="With --basis pressure: MPa for files in kelvin and angstrom, else energy unit/length unit^3. "
            "Without it, the pressure of the file's own state (a study: of its equimolar mixture)."
        ),
    ] = None,
    closure: Annotated[str | None, typer.Option(help="Closure in place of the file's: rhnc, hnc, py, msa.")] = None,
    accuracy: Annotated[
        float | None, typer.Option(help="Relative accuracy of neighbour counts, 1e-10 to 1e-2.")
    ] = None,
    one_closure: Annotated[
        bool, typer.Option("--one-closure", help="Leave out the other closures: faster, but without their gap.")
    ] = False,
    json: Annotated[bool, typer.Option("--json", help="Print one JSON object and nothing else.")] = False,
    plot: Annotated[Path | None, typer.Option(metavar="FILE", help="Write the figure: .png, .svg or .pdf.")] = None,
) -> None:
    """Activity coefficients of the true mixture, with parts, routes, closures and stability."""
    from localcomp.activity_report import as_json, read_requests, report_isotherm, study_json
    from localcomp.cli.outputs import check_writable, print_json

    check_writable("--plot", plot, file, FIGURE_SUFFIXES)
    _check(basis, pressure, accuracy)
    requests = read_requests(file, _closure(closure), accuracy, basis, pressure, not one_closure)
    for request in requests:
        if request.mixture.species < 2:
            raise BadInput([Problem(str(file), "[mixture] diameter", "", "activity coefficients need two species or "
                                    "more")])  # fmt: skip
    if plot is not None and len(requests) > MOST_PANELS:
        raise BadInput([Problem(str(file), "--plot", str(len(requests)), f"up to {MOST_PANELS} isotherms in a figure")])
    reports = [report_isotherm(request) for request in requests]
    if json:
        print_json(as_json(reports[0]) if len(reports) == 1 else study_json(reports))
    else:
        from localcomp.cli.activity_tables import print_isotherm

        for report in reports:
            print_isotherm(report)
    for report in reports:
        if report.found is None:
            typer.echo(f"no answer: {report.reason}", err=True)
    if plot is not None:
        _draw(reports, plot)
    if not any(report.found is not None and report.found.available.any() for report in reports):
        raise typer.Exit(NOTHING_AVAILABLE)


def _check(basis: str, pressure: float | None, accuracy: float | None) -> None:
    problems = []
    if basis not in ("packing", "pressure"):
        problems.append(Problem("command line", "--basis", basis, "one of: packing, pressure"))
    if pressure is not None and basis == "packing":
        problems.append(Problem("command line", "--pressure", str(pressure), "is only used with --basis pressure"))
    if pressure is not None and not abs(pressure) < 1e9:
        problems.append(Problem("command line", "--pressure", str(pressure), "a finite number"))
    if accuracy is not None and not 1e-10 <= accuracy <= 1e-2:
        problems.append(Problem("command line", "--accuracy", str(accuracy), "a number between 1e-10 and 1e-2"))
    if problems:
        raise BadInput(problems)


def _closure(name: str | None) -> str | None:
    from localcomp.tables import nearest
    from ozsolve import CLOSURES, InputError, get_closure

    if name is None:
        return None
    try:
        return get_closure(name).name
    except InputError as error:
        near = nearest(name.lower(), CLOSURES)
        raise BadInput([Problem("command line", "--closure", name, error.allowed + near)]) from None


def _draw(reports: list[IsothermReport], path: Path) -> None:
    from localcomp.activity_curves import isotherm_panels
    from localcomp.figures.activity import activity_figure
    from localcomp.figures.style import save

    panels = isotherm_panels(reports)
    if not panels:
        typer.echo(f"no figure: {path} was not written", err=True)
        return
    try:
        save(activity_figure(panels), path)
    except OSError as error:
        raise BadInput([Problem(str(path), "--plot", "", f"cannot be written ({error.strerror})")]) from None
    typer.echo(f"wrote {path}", err=True)
