"""Where results go: checked before anything is computed."""

from __future__ import annotations

import json
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import typer

from localcomp.errors import BadInput, Problem


def check_writable(option: str, path: Path | None, suffixes: Sequence[str] = ()) -> None:
    """Complain about an output path while nothing is lost yet."""
    if path is None:
        return
    if suffixes and path.suffix.lower() not in suffixes:
        raise BadInput([Problem(str(path), option, "", f"the name must end in {', '.join(suffixes)}")])
    if path.is_dir():
        raise BadInput([Problem(str(path), option, "", "is a directory; name a file")])
    if not path.parent.is_dir():
        raise BadInput([Problem(str(path), option, "", f"the directory {path.parent} does not exist")])


def write_text(option: str, path: Path, text: str) -> None:
    """Write a file or say why not; what was printed before stays printed."""
    try:
        path.write_text(text, encoding="utf-8")
    except OSError as error:
        raise BadInput([Problem(str(path), option, "", f"cannot be written ({error.strerror})")]) from None
    typer.echo(f"wrote {path}", err=True)


def print_json(body: dict[str, Any]) -> None:
    """One JSON object on standard output and nothing else."""
    typer.echo(json.dumps(body, indent=2, allow_nan=False))
