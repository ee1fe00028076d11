"""`localcomp audit`: what each model assumes about neighbours, held against what is found."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from localcomp.cli.study_command import INTERRUPTED, STORE_NAME, OutOption, WorkersOption, cores, make_directory

if TYPE_CHECKING:
    from localcomp.audit import Audit
    from localcomp.study import Study


def audit(
    study: Annotated[Path, typer.Argument(metavar="STUDY", help="Study file, or the state file of a mixture (TOML).")],
    out: OutOption,
    models: Annotated[
        str | None, typer.Option(metavar="NAMES", help="Models by name, comma-separated, e.g. wilson,nrtl,uniquac.")
    ] = None,
    json: Annotated[bool, typer.Option("--json", help="Print the verdicts as JSON.")] = False,
    workers: WorkersOption = cores(),
) -> None:
    """Hold each activity model's statements about neighbours against those found, over a whole class.

    Writes claims.csv, neighbors.csv, verdicts.json and figures (PNG and SVG) to DIR; states already
    solved there are used again. A single state is judged in a small class around it.
    """
    from dataclasses import replace

    from localcomp.audit import run_audit
    from localcomp.auditplan import plan_audit, solve_plan
    from localcomp.auditsettings import models_option
    from localcomp.audittables import verdicts_json
    from localcomp.cli.audit_tables import print_audit
    from localcomp.cli.outputs import print_json
    from localcomp.cli.study_command import Bar
    from localcomp.errors import NoAnswer
    from localcomp.executors import SerialExecutor, pool
    from localcomp.standing import standings
    from localcomp.store import Store

    found = _read(study)
    settings = found.audit if models is None else replace(found.audit, models=models_option(models))
    make_directory(out)
    plan = plan_audit(found, settings)
    total = sum(len(part.cases) for part in plan.studies())
    if not json:
        typer.echo(
            f"{found.name}: {len(plan.main)} states; with wells off, other closures ({', '.join(plan.closures[1:])}), "
            f"other shell rules and ternaries: {total} to solve"
        )
    with Store(out / STORE_NAME) as store:
        try:
            with Bar(total) as bar:
                if workers > 1:
                    with pool(workers) as executor:
                        findings = solve_plan(plan, store, executor, workers, bar.update)
                else:
                    findings = solve_plan(plan, store, SerialExecutor(), 1, bar.update)
        except KeyboardInterrupt:
            typer.echo("interrupted; what was solved is stored, the same command goes on from there", err=True)
            raise typer.Exit(INTERRUPTED) from None
    judged = findings[plan.closures[0]]
    if not judged.main.solved.any():
        raise NoAnswer(f"none of the {len(plan.main)} states has a physical solution under {plan.closures[0]}")
    names = plan.main[0].mixture.names if plan.main else ()
    result = run_audit(judged, settings, plan.closures[0], {c: findings[c] for c in plan.closures[1:]}, names)
    result = replace(result, temperature_unit=" K" if found.units.real else "")
    ranked = standings(result)
    body = verdicts_json(result, ranked, found)
    written = _write(out, result, found, [findings[c].main.ln_ratio for c in plan.closures[1:]], body)
    if json:
        print_json(body)
    else:
        print_audit(result, ranked)
        typer.echo(f"wrote to {out}: {', '.join(written)}")


def _read(path: Path) -> Study:
    """A study, or the small class around a single state."""
    from localcomp.auditplan import study_of_state
    from localcomp.inputs import read_state
    from localcomp.study import read_study
    from localcomp.tables import load_toml

    if "state" in load_toml(path):
        return study_of_state(read_state(path))
    return read_study(path)


def _write(out: Path, result: Audit, study: Study, others: list, body: dict) -> list[str]:  # type: ignore[type-arg]
    import json as encoder

    from localcomp import auditcurves as curves
    from localcomp.audittables import claims_csv, neighbors_csv
    from localcomp.cli.outputs import write_file
    from localcomp.figures.multiplicity import multiplicity_lines, multiplicity_maps
    from localcomp.figures.ratios import ratio_figure, reciprocity_figure, slope_figure
    from localcomp.figures.style import save
    from localcomp.figures.verdicts import verdict_figure

    texts = {
        "claims.csv": claims_csv(result),
        "neighbors.csv": neighbors_csv(result, study),
        "verdicts.json": encoder.dumps(body, indent=2, allow_nan=False) + "\n",
    }
    for name, text in texts.items():
        write_file(out / name, text)
    figures = {"verdicts": verdict_figure(curves.verdict_grid(result), f"{study.name}: what holds over the class")}
    if result.findings.main.solved.any() and result.findings.main.mole_fractions.shape[1] > 1:
        figures["boltzmann"] = slope_figure(curves.slope_table(result), f"{study.name}: which exponent a pair obeys")
        if result.findings.main.mole_fractions.shape[1] == 2:
            number = curves.shown_mixture(result)
            mixture = curves.describe_mixture(result, number)
            first, second = curves.species_of(result, number)
            cut = curves.shown_conditions(result, number)
            both = curves.shown_conditions(result, number, with_temperature=True)
            panels = curves.ratio_panels(result, number, curves.ln_ratio_uncertainty(result, others))
            figures["ratios"] = ratio_figure(
                panels, f"Neighbour ratios, {mixture}, {cut}", first, curves.left_out(result)
            )
            implied, real = curves.reciprocity_curves(result, number)
            figures["reciprocity"] = reciprocity_figure(
                implied, real, f"Pairs counted from both ends,\n{mixture}, {both}", (first, second), first
            )
            maps = curves.multiplicity_panels(result)
            if maps:
                figures["multiplicity"] = multiplicity_maps(
                    maps, f"Measured multiplicity of β(ε_ij − ε_ii), {curves.map_conditions(result)}"
                )
            lines = curves.multiplicity_curves(result, number)
            if lines:
                name = "multiplicity_conditions" if maps else "multiplicity"
                figures[name] = multiplicity_lines(lines, f"Measured multiplicity,\n{mixture}", first)
    for name, figure in figures.items():
        for suffix in (".png", ".svg"):
            save(figure, out / f"{name}{suffix}")
    return [*texts, *(f"{name}.png/.svg" for name in figures)]
