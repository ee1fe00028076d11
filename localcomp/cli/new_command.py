"""`localcomp new`: files to start from."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from localcomp.errors import BadInput, Problem


def new(directory: Annotated[Path, typer.Argument(metavar="DIR", help="Where to write; made if missing.")]) -> None:
    """Write a commented state file and a pure-liquid file that run as they are."""
    from localcomp.templates import LIQUID_TOML, STATE_TOML

    files = {"state.toml": STATE_TOML, "liquid.toml": LIQUID_TOML}
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
    typer.echo(f"wrote {directory / 'state.toml'} and {directory / 'liquid.toml'}; next:")
    typer.echo(f"  localcomp state {directory / 'state.toml'}")
    typer.echo(f"  localcomp calibrate {directory / 'liquid.toml'}")
