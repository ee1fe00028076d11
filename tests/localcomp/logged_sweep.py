"""A sweep on two processes that writes down every work unit it begins: python -m tests.localcomp.logged_sweep."""

from __future__ import annotations

import functools
import os
import sys
from pathlib import Path

import localcomp.sweep
from localcomp.executors import pool
from localcomp.store import Row, Store
from localcomp.study import read_study
from localcomp.sweep import Unit, run, work


def logged(log: str, unit: Unit) -> list[Row]:
    """`work`, after a line in the log."""
    handle = os.open(log, os.O_CREAT | os.O_APPEND | os.O_WRONLY)
    os.write(handle, f"{unit.keys[0]}\n".encode())
    os.close(handle)
    return work(unit)


def main(study: str, out: str, log: str) -> None:
    """Sweep as the command does."""
    Path(out).mkdir(exist_ok=True)
    localcomp.sweep.work = functools.partial(logged, log)
    with Store(Path(out) / "states.sqlite") as store, pool(2) as executor:
        run(read_study(study), store, executor, 2)


if __name__ == "__main__":
    main(*sys.argv[1:])
