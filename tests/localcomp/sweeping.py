"""Helpers of the sweep tests: a study file, a sweep in its own process, its final table."""

from __future__ import annotations

import gc
import os
import signal
import struct
import subprocess
import sys
import time
from multiprocessing.queues import SimpleQueue
from pathlib import Path

STUDY = """\
[class]
size_ratio = {sizes}
energy_ratio = [1.0, 1.5, 2.0]
k = [0.0, 0.1]
[conditions]
temperature = [1.6, 2.0, 2.5, 3.0]
packing_fraction = 0.4
composition = {compositions}
closures = ["rhnc"]
"""


def write_study(path: Path, sizes: str = "[1.0, 1.4]", compositions: str = "[0.0, 0.3, 0.7]") -> Path:
    path.write_text(STUDY.format(sizes=sizes, compositions=compositions), encoding="utf-8")
    return path


def command(*words: str | Path) -> list[str]:
    return [sys.executable, "-m", "localcomp", *(str(word) for word in words)]


def run(*words: str | Path, timeout: float = 300) -> subprocess.CompletedProcess[str]:
    return subprocess.run(command(*words), capture_output=True, text=True, timeout=timeout, check=False)


def table_bytes(results: Path) -> bytes:
    done = run("table", results)
    assert done.returncode == 0, done.stderr
    return (results / "states.csv").read_bytes()


def half_a_result() -> None:
    """In a worker: begin to write a result and die, as a kill at the wrong moment does."""
    for queue in [found for found in gc.get_objects() if isinstance(found, SimpleQueue)]:
        writer = queue._writer  # type: ignore[attr-defined]
        queue._wlock.acquire()  # type: ignore[attr-defined]
        os.write(writer.fileno(), struct.pack("!i", 100_000) + b"x" * 1000)
    os.kill(os.getpid(), signal.SIGKILL)


def short_work() -> int:
    time.sleep(0.2)
    return 1
