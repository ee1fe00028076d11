"""`localcomp check`, `localcomp sweep`, `localcomp table`: studies of many states."""

from __future__ import annotations

import os
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from localcomp.errors import BadInput, Problem

if TYPE_CHECKING:
    from localcomp.study import Study

STORE_NAME = "states.sqlite"
INTERRUPTED = 130

StudyArgument = Annotated[
    Path, typer.Argument(metavar="STUDY", help="Study file (TOML); `localcomp new --study DIR` writes one.")
]
OutOption = Annotated[Path, typer.Option("--out", metavar="DIR", help="Where results go; made if missing.")]
WorkersOption = Annotated[int, typer.Option("--workers", min=1, help="Processes on this machine.")]


def cores() -> int:
    """Cores this process may use."""
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else (os.cpu_count() or 1)


def check(study: StudyArgument, workers: WorkersOption = cores()) -> None:
    """Say how many states a study has, how long it will take, and every mistake in its file."""
    from localcomp.estimate import estimate
    from localcomp.study import read_study

    found = read_study(study)
    _describe(found)
    result = estimate(found, workers)
    typer.echo(
        f"about {_duration(result.seconds)} on {workers} process{'es' if workers > 1 else ''} "
        f"(trial: {result.tried} states in {result.trial_seconds:.1f} s on one, {result.failed} without a physical "
        "solution)"
    )


def sweep(
    study: StudyArgument,
    out: OutOption,
    workers: WorkersOption = cores(),
    cluster: Annotated[
        str | None, typer.Option(metavar="ADDRESS", help="Run on a Dask scheduler, e.g. tcp://host:8786.")
    ] = None,
) -> None:
    """Solve every state of a study; interrupted runs resume, finished ones do nothing."""
    from contextlib import ExitStack

    from localcomp.executors import SerialExecutor, pool
    from localcomp.executors import cluster as dask_cluster
    from localcomp.store import Store
    from localcomp.study import read_study
    from localcomp.sweep import run

    found = read_study(study)
    make_directory(out)
    _describe(found)
    with ExitStack() as stack:
        store = stack.enter_context(Store(out / STORE_NAME))
        if cluster is not None:
            executor = stack.enter_context(dask_cluster(cluster))
        else:
            executor = stack.enter_context(pool(workers)) if workers > 1 else SerialExecutor()
        try:
            with Bar(len(found.cases)) as bar:
                result = run(found, store, executor, workers, bar.update)
        except KeyboardInterrupt:
            typer.echo("interrupted; what was stored is safe, the same command resumes", err=True)
            raise typer.Exit(INTERRUPTED) from None
    rate = f", {result.computed / result.seconds:.0f} states a second" if result.computed else ""
    typer.echo(
        f"{result.total} states: {result.solved} solved, {result.failed} without a physical solution; "
        f"{result.computed} computed now in {_duration(result.seconds)}{rate}"
    )
    typer.echo(f"results: {out / STORE_NAME}; next: localcomp table {out}")


def table(
    directory: Annotated[Path, typer.Argument(metavar="DIR", help="Directory of a sweep.")],
    csv: Annotated[Path | None, typer.Option(metavar="FILE", help="Where to write (default: DIR/states.csv).")] = None,
) -> None:
    """Write a sweep's results as CSV, one row per state and pair, and summarise the class."""
    from localcomp.classtable import rows_csv, stored_study, summary
    from localcomp.cli.outputs import check_writable, write_text
    from localcomp.cli.study_tables import print_summary
    from localcomp.store import Store

    target = csv if csv is not None else directory / "states.csv"
    if not directory.is_dir():
        raise BadInput([Problem(str(directory), "", "", "no such directory; name one that `localcomp sweep` wrote")])
    check_writable("--csv", target, directory / STORE_NAME)
    with Store(directory / STORE_NAME, create=False) as store:
        study = stored_study(store, directory)
        results = list(store.results(study.keys()))
    write_text("--csv", target, rows_csv(study, results))
    print_summary(study, summary(study, results))


def _describe(study: Study) -> None:
    typer.echo(
        f"{study.name}: {len(study.cases)} states ({study.kind}; closures {', '.join(study.closures)}; "
        f"shell rule {study.rule.description}; accuracy {study.accuracy:g})"
    )


def make_directory(out: Path) -> None:
    """Make the output directory or say why not."""
    try:
        out.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise BadInput([Problem(str(out), "--out", "", f"cannot be made ({error.strerror})")]) from None


def _duration(seconds: float) -> str:
    if seconds < 90.0:
        return f"{seconds:.1f} s"
    if seconds < 5400.0:
        return f"{seconds / 60.0:.1f} min"
    return f"{seconds / 3600.0:.1f} h"


class Bar:
    """Progress with rate and time left, on standard error."""

    def __init__(self, total: int, what: str = "states") -> None:
        from rich.console import Console
        from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn, TimeRemainingColumn

        self._progress = Progress(
            TextColumn(what),
            BarColumn(),
            MofNCompleteColumn(),
            TextColumn("{task.fields[rate]}"),
            TimeRemainingColumn(),
            TextColumn("{task.fields[failed]}"),
            console=Console(stderr=True),
        )
        self._task = self._progress.add_task("states", total=total, rate="", failed="")
        self._began = 0.0
        self._first: int | None = None

    def __enter__(self) -> Bar:
        import time

        self._began = time.monotonic()
        self._progress.start()
        return self

    def update(self, present: int, total: int, failed: int) -> None:
        """States present of all, failed so far."""
        import time

        if self._first is None:
            self._first = present
        elapsed = time.monotonic() - self._began
        self._progress.update(
            self._task, completed=present, total=total,
            rate=f"{max(present - self._first, 0) / max(elapsed, 1e-9):.0f}/s",
            failed=f"{failed} without solution" if failed else "",
        )  # fmt: skip

    def __exit__(self, *_: object) -> None:
        self._progress.stop()
