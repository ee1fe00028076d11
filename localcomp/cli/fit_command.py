"""`localcomp fit`: models regressed to the true activity coefficients and held to account."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from localcomp.cli.study_command import INTERRUPTED, OutOption, StudyArgument, WorkersOption, cores, make_directory

if TYPE_CHECKING:
    from localcomp.fitstudy import FitReport


def fit(
    study: StudyArgument,
    out: OutOption,
    models: Annotated[
        str | None, typer.Option(metavar="NAMES", help="Models by name, comma-separated, e.g. wilson,nrtl,uniquac.")
    ] = None,
    json: Annotated[bool, typer.Option("--json", help="Print the fits as JSON.")] = False,
    workers: WorkersOption = cores(),
) -> None:
    """Fit each model to the true ln gamma of every pair, then look at what the fit implies.

    Writes fits.csv, implied_ratios.csv, ternary.csv, fits.json and figures (PNG and SVG) to DIR.
    """
    from contextlib import ExitStack

    from localcomp.auditsettings import models_option
    from localcomp.cli.fit_tables import print_fits
    from localcomp.cli.outputs import print_json
    from localcomp.cli.study_command import Bar
    from localcomp.errors import NoAnswer
    from localcomp.executors import SerialExecutor, pool
    from localcomp.fitstudy import fit_study, pair_tasks
    from localcomp.fittables import as_json
    from localcomp.study import read_study

    found = read_study(study)
    chosen = found.audit.models if models is None else models_option(models)
    tasks = pair_tasks(found, chosen)
    make_directory(out)
    if not json:
        typer.echo(f"{found.name}: {len(tasks)} pairs and densities, {len(chosen)} models, closure {found.closures[0]}")
    with ExitStack() as stack:
        executor = stack.enter_context(pool(workers)) if workers > 1 else SerialExecutor()
        bar = stack.enter_context(Bar(len(tasks), "pairs"))
        try:
            report = fit_study(found, chosen, executor, lambda done, total: bar.update(done, total, 0))
        except KeyboardInterrupt:
            typer.echo("interrupted; nothing was written", err=True)
            raise typer.Exit(INTERRUPTED) from None
    if all(pair.reason for pair in report.pairs):
        raise NoAnswer(f"no pair has activity coefficients to fit: {report.pairs[0].reason}")
    body = as_json(report)
    written = _write(out, report, body)
    if json:
        print_json(body)
    else:
        print_fits(report)
        typer.echo(f"wrote to {out}: {', '.join(written)}")


def _write(out: Path, report: FitReport, body: dict) -> list[str]:  # type: ignore[type-arg]
    import json as encoder

    from localcomp import fitcurves as curves
    from localcomp.cli.outputs import write_file
    from localcomp.figures.fits import energy_figure, fit_figure, ratio_parity
    from localcomp.figures.style import save
    from localcomp.fitpair import BAD_RATIO
    from localcomp.fittables import fits_csv, implied_csv, ternary_csv

    texts = {
        "fits.csv": fits_csv(report),
        "implied_ratios.csv": implied_csv(report),
        "ternary.csv": ternary_csv(report),
        "fits.json": encoder.dumps(body, indent=2, allow_nan=False) + "\n",
    }
    for name, text in texts.items():
        write_file(out / name, text)
    units = report.study.units
    pair = curves.shown_pair(report)
    assert pair is not None
    heading = curves.pair_heading(pair, " K" if units.real else "")
    names = pair.task.mixture.names
    figures = {
        "fits": fit_figure(curves.fit_panels(pair), f"ln gamma, {heading}", (names[0], names[1])),
        "implied_ratios": ratio_parity(curves.ratio_clouds(report), BAD_RATIO, f"{report.study.name}: neighbours"),
        "fitted_energies": energy_figure(
            curves.energy_clouds(report),
            f"{report.study.name}: energies of unlike against like contacts",
            "K" if units.real else "energy unit",
            pair.task.z,
        ),
    }
    for name, figure in figures.items():
        for suffix in (".png", ".svg"):
            save(figure, out / f"{name}{suffix}")
    return [*texts, *(f"{name}.png/.svg" for name in figures)]
