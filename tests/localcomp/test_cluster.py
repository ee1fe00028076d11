"""A sweep on a Dask scheduler with two workers on the loopback interface, one of them killed in mid-run."""

from __future__ import annotations

import subprocess
import sys
import time
from collections.abc import Iterator
from pathlib import Path

import pytest

from tests.localcomp.sweeping import command, run, table_bytes, write_study


def wait_for(path: Path, deadline: float) -> str:
    while time.monotonic() < deadline:
        if path.exists() and path.read_text().strip():
            return path.read_text()
        time.sleep(0.1)
    raise TimeoutError(f"{path} did not appear")


@pytest.fixture
def scheduler(tmp_path: Path) -> Iterator[tuple[str, list[subprocess.Popen[bytes]]]]:
    """Address of a scheduler, and its two worker processes."""
    info = tmp_path / "scheduler.json"
    dask = [sys.executable, "-m", "distributed.cli.dask_scheduler"]
    processes = [
        subprocess.Popen(
            [*dask, "--host", "127.0.0.1", "--port", "0", "--no-dashboard", "--scheduler-file", str(info)],
            stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL,
        )
    ]  # fmt: skip
    try:
        import json

        address = json.loads(wait_for(info, time.monotonic() + 60))["address"]
        for n in range(2):
            worker = [
                sys.executable, "-m", "distributed.cli.dask_worker", address, "--nthreads", "1", "--no-nanny",
                "--no-dashboard", "--host", "127.0.0.1", "--local-directory", str(tmp_path / f"worker{n}"),
            ]  # fmt: skip
            processes.append(subprocess.Popen(worker, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL))
        yield address, processes[1:]
    finally:
        for process in processes:
            process.kill()
            process.wait()


def test_a_worker_dies_and_the_table_is_the_same(scheduler, tmp_path: Path) -> None:
    address, workers = scheduler
    study = write_study(tmp_path / "study.toml", "[1.0, 1.2, 1.4, 1.6]", "{ from = 0.05, to = 0.95, steps = 9 }")
    sweep = subprocess.Popen(
        command("sweep", study, "--out", tmp_path / "far", "--cluster", address),
        stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True,
    )  # fmt: skip
    store = tmp_path / "far" / "states.sqlite-wal"
    deadline = time.monotonic() + 90
    while time.monotonic() < deadline and not (store.exists() and store.stat().st_size > 200_000):
        time.sleep(0.02)
        if sweep.poll() is not None:
            break
    still_running = sweep.poll() is None
    workers[0].kill()
    output, errors = sweep.communicate(timeout=180)
    assert sweep.returncode == 0, errors
    assert still_running, "the sweep was over before the worker died: the test has lost its subject"
    assert "864 solved" in output
    assert run("sweep", study, "--out", tmp_path / "near", "--workers", "2").returncode == 0
    assert table_bytes(tmp_path / "far") == table_bytes(tmp_path / "near")


def test_no_scheduler_is_said_so(tmp_path: Path) -> None:
    study = write_study(tmp_path / "study.toml")
    done = run("sweep", study, "--out", tmp_path / "out", "--cluster", "tcp://127.0.0.1:1", timeout=120)
    assert done.returncode == 2
    assert "no scheduler answers" in done.stderr
    assert "Traceback" not in done.stderr
