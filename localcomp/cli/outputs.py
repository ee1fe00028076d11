"""Where results go: checked before anything is computed."""

from __future__ import annotations

import json
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import typer

from localcomp.errors import BadInput, Problem


def check_writable(option: str, path: Path | None, source: Path, suffixes: Sequence[str] = ()) -> None:
    """Complain about an output path while nothing is lost yet; `source` is the input, never overwritten."""
    if path is None:
        return
    if suffixes and path.suffix.lower() not in suffixes:
        raise BadInput([Problem(str(path), option, "", f"the name must end in {', '.join(suffixes)}")])
    try:
        if path.is_dir():
            raise BadInput([Problem(str(path), option, "", "is a directory; name a file")])
        if not path.parent.is_dir():
            raise BadInput([Problem(str(path), option, "", f"the directory {path.parent} does not exist")])
        if path.exists() and source.exists() and path.samefile(source):
            raise BadInput([Problem(str(path), option, "", "is the input file; name another file")])
        _try_to_open(path)
    except OSError as error:
        raise BadInput([Problem(str(path), option, "", f"cannot be written ({error.strerror})")]) from None


def _try_to_open(path: Path) -> None:
    """Open for writing and leave everything as it was; pipes and devices are taken on trust."""
    is_new = not path.exists()
    if is_new or path.is_file():
        path.open("ab").close()
    if is_new:
        path.unlink()


def write_text(option: str, path: Path, text: str) -> None:
    """Write a file or say why not; what was printed before stays printed."""
    try:
        path.write_text(text, encoding="utf-8")
    except OSError as error:
        raise BadInput([Problem(str(path), option, "", f"cannot be written ({error.strerror})")]) from None
    typer.echo(f"wrote {path}", err=True)


def write_file(path: Path, text: str) -> None:
    """Write one of several results into an output directory, or say why not."""
    try:
        path.write_text(text, encoding="utf-8")
    except OSError as error:
        raise BadInput([Problem(str(path), "--out", "", f"cannot be written ({error.strerror})")]) from None


def print_json(body: dict[str, Any]) -> None:
    """One JSON object on standard output and nothing else."""
    typer.echo(json.dumps(body, indent=2, allow_nan=False))
