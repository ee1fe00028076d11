"""`localcomp new`: files to start from."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from localcomp.errors import BadInput, Problem


def new(
    directory: Annotated[Path, typer.Argument(metavar="DIR", help="Where to write; made if missing.")],
    study: Annotated[bool, typer.Option("--study", help="Write a study file (a class of mixtures) instead.")] = False,
) -> None:
    """Write commented files that run as they are: a state and a pure liquid, or a study."""
    from localcomp.templates import LIQUID_TOML, STATE_TOML, STUDY_TOML

    files = {"study.toml": STUDY_TOML} if study else {"state.toml": STATE_TOML, "liquid.toml": LIQUID_TOML}
    try:
        if directory.exists() and not directory.is_dir():
            raise BadInput([Problem(str(directory), "", "", "is a file; name a directory")])
        for name in files:
            if (directory / name).exists():
                raise BadInput([Problem(str(directory / name), "", "", "exists already and is not overwritten")])
        directory.mkdir(parents=True, exist_ok=True)
        for name, text in files.items():
            (directory / name).write_text(text, encoding="utf-8")
    except OSError as error:
        raise BadInput([Problem(str(directory), "", "", f"cannot be written ({error.strerror})")]) from None
    typer.echo(f"wrote {' and '.join(str(directory / name) for name in files)}; next:")
    if study:
        typer.echo(f"  localcomp check {directory / 'study.toml'}")
        typer.echo(f"  localcomp sweep {directory / 'study.toml'} --out {directory / 'results'}")
        typer.echo(f"  localcomp audit {directory / 'study.toml'} --out {directory / 'results'}")
        return
    typer.echo(f"  localcomp state {directory / 'state.toml'}")
    typer.echo(f"  localcomp calibrate {directory / 'liquid.toml'}")
