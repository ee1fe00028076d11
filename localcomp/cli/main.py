"""The command `localcomp`."""

from __future__ import annotations

import errno
import io
import os
import sys
from typing import Annotated, NoReturn

import typer

from localcomp import __version__
from localcomp.cli import (
    activity_command,
    audit_command,
    calibrate_command,
    components_command,
    fit_command,
    new_command,
    state_command,
    study_command,
)
from localcomp.errors import BadInput, LocalcompError, NoAnswer

WRONG_INPUT = 2
NO_SOLUTION = 3
INTERRUPTED = 130

app = typer.Typer(
    add_completion=False,
    no_args_is_help=True,
    pretty_exceptions_enable=False,
    help="Who sits next to whom in a liquid mixture, and what activity models assume about it.",
    epilog="Spheres with square wells, from the Ornstein-Zernike equation. Start with: localcomp new DIR",
)


def _version(value: bool) -> None:
    if value:
        typer.echo(f"localcomp {__version__}")
        raise typer.Exit


@app.callback()
def _root(
    version: Annotated[
        bool, typer.Option("--version", callback=_version, is_eager=True, help="Show the version and stop.")
    ] = False,
) -> None:
    """Options of the command itself."""


app.command("new")(new_command.new)
app.command("state")(state_command.state)
app.command("activity")(activity_command.activity)
app.command("components")(components_command.components)
app.command("calibrate")(calibrate_command.calibrate)
app.command("check")(study_command.check)
app.command("sweep")(study_command.sweep)
app.command("table")(study_command.table)
app.command("audit")(audit_command.audit)
app.command("fit")(fit_command.fit)


def run() -> None:
    """Entry point: turns every failure into a message and an exit status, never a traceback."""
    if isinstance(sys.stdout, io.TextIOWrapper):  # a character the terminal cannot show is no reason to stop
        sys.stdout.reconfigure(errors="replace")
    os.environ["MPLBACKEND"] = "agg"  # figures go to files; what the environment prefers is for windows
    try:
        app()
    except BadInput as error:
        for problem in error.problems:
            typer.echo(f"error: {problem}", err=True)
        sys.exit(WRONG_INPUT)
    except NoAnswer as error:
        typer.echo(f"no answer: {error}", err=True)
        sys.exit(NO_SOLUTION)
    except LocalcompError as error:
        typer.echo(f"error: {error}", err=True)
        sys.exit(1)
    except KeyboardInterrupt:
        typer.echo("interrupted", err=True)
        sys.exit(INTERRUPTED)
    except BrokenPipeError:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        sys.exit(1)
    except OSError as error:
        if error.errno not in (errno.ENOSPC, errno.EIO, errno.EDQUOT):
            _defect(error)
        typer.echo(f"error: standard output cannot be written ({error.strerror})", err=True)
        sys.stdout = io.StringIO()  # what is buffered has nowhere to go
        sys.exit(1)
    except Exception as error:
        _defect(error)


def _defect(error: Exception) -> NoReturn:
    """The last net: a user gets a sentence, a developer asks for the rest."""
    if os.environ.get("LOCALCOMP_TRACEBACK"):
        raise error
    typer.echo(
        f"internal error: {type(error).__name__}: {error}\n"
        "This is a defect of localcomp. Set LOCALCOMP_TRACEBACK=1 and run again to see where.",
        err=True,
    )
    sys.exit(1)
