"""`localcomp state`: neighbours and thermodynamics of one state."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from localcomp.errors import BadInput, Problem

if TYPE_CHECKING:
    from localcomp.inputs import StateFile
    from localcomp.report import StateReport

FIGURE_SUFFIXES = (".png", ".svg", ".pdf")


def state(
    file: Annotated[Path, typer.Argument(metavar="FILE", help="State file (TOML); `localcomp new DIR` writes one.")],
    closure: Annotated[str | None, typer.Option(help="Closure in place of the file's: rhnc, hnc, py, msa.")] = None,
    accuracy: Annotated[
        float | None, typer.Option(help="Relative accuracy of neighbour counts, 1e-10 to 1e-2.")
    ] = None,
    json: Annotated[bool, typer.Option("--json", help="Print one JSON object and nothing else.")] = False,
    csv: Annotated[Path | None, typer.Option(metavar="FILE", help="Write the neighbour table as CSV.")] = None,
    plot: Annotated[
        Path | None, typer.Option(metavar="FILE", help="Write the figure of g(r): .png, .svg or .pdf.")
    ] = None,
    compare_closures: Annotated[
        bool, typer.Option("--compare-closures", help="Put all closures side by side.")
    ] = False,
) -> None:
    """Solve one state: who sits next to whom, what models state about it, thermodynamics."""
    from localcomp.cli.outputs import check_writable, print_json, write_text
    from localcomp.inputs import read_state
    from localcomp.report import as_csv, as_json, report_state
    from localcomp.report import compare_closures as all_closures

    check_writable("--csv", csv, file)
    check_writable("--plot", plot, file, FIGURE_SUFFIXES)
    if csv is not None and plot is not None and csv.resolve() == plot.resolve():
        raise BadInput([Problem(str(csv), "--csv", "", "is the name given to --plot too; name another file")])
    request = _overridden(read_state(file), closure, accuracy)
    report = report_state(request)
    others = all_closures(request) if compare_closures else []
    if json:
        body = as_json(report)
        if others:
            body["closures"] = {other.request.closure: as_json(other) for other in others}
        print_json(body)
    else:
        from localcomp.cli.state_tables import print_comparison, print_state

        print_state(report)
        if others:
            print_comparison(others)
    if csv is not None:
        write_text("--csv", csv, as_csv(others or [report]))
    if plot is not None and report.usable:
        _draw(report, plot)
    if not report.usable:
        if plot is not None:
            typer.echo(f"no figure: {plot} was not written", err=True)
        if not json:
            lead = "no answer" if report.shell_reason else "no physical solution"
            typer.echo(f"{lead}: {report.message}", err=True)
        raise typer.Exit(3)


def _overridden(request: StateFile, closure: str | None, accuracy: float | None) -> StateFile:
    """The request with the command line's closure and accuracy."""
    from localcomp.tables import nearest
    from ozsolve import CLOSURES, InputError, get_closure

    if closure is not None:
        try:
            request = replace(request, closure=get_closure(closure).name)
        except InputError as error:
            near = nearest(closure.lower(), CLOSURES)
            raise BadInput([Problem("command line", "--closure", closure, error.allowed + near)]) from None
    if accuracy is not None:
        if not 1e-10 <= accuracy <= 1e-2:
            raise BadInput([Problem("command line", "--accuracy", str(accuracy), "a number between 1e-10 and 1e-2")])
        request = replace(request, accuracy=accuracy)
    return request


def _draw(report: StateReport, path: Path) -> None:
    from localcomp.curves import pair_curves
    from localcomp.figures.distribution import distribution_figure, short
    from localcomp.figures.style import save

    request = report.request
    fractions = ", ".join(
        f"x({short(name)}) = {x:.4g}"
        for name, x in zip(request.mixture.names, request.state.mole_fractions, strict=True)
    )
    unit = "K" if request.units.real else ""
    symbol = "T" if request.units.real else "kT"
    title = (
        f"{report.solution.closure.title}: {symbol} = {request.state.temperature:g} {unit}".rstrip()
        + f", packing fraction {request.mixture.packing_fraction(request.state):.4g}, {fractions}"
    )
    figure = distribution_figure(pair_curves(report), title, request.units.length_label)
    try:
        save(figure, path)
    except OSError as error:
        raise BadInput([Problem(str(path), "--plot", "", f"cannot be written ({error.strerror})")]) from None
    typer.echo(f"wrote {path}", err=True)
