"""Sweeps that are killed, interrupted, changed, run twice: nothing is lost and nothing differs."""

from __future__ import annotations

import csv
import io
import random
import signal
import subprocess
import sys
import time
from concurrent.futures import BrokenExecutor, Executor, Future, wait
from pathlib import Path
from typing import Any

import pytest

from localcomp import executors
from localcomp.executors import SerialExecutor, pool
from localcomp.store import Store, StoreError
from localcomp.study import read_study
from localcomp.sweep import AHEAD, NUMBERS, UNIT_SIZE, WorkerLost, is_solved
from localcomp.sweep import run as run_sweep
from tests.localcomp.sweeping import command, half_a_result, run, short_work, table_bytes, write_study

MANY = "{ from = 0.02, to = 0.98, steps = 21 }"
SIZES = "[1.0, 1.2, 1.4, 1.6]"
KILLS = 10
WORKERS = 2


def test_a_sweep_runs_resumes_and_is_idle_when_finished(tmp_path: Path) -> None:
    study = write_study(tmp_path / "study.toml")
    first = run("sweep", study, "--out", tmp_path / "out", "--workers", "1")
    assert first.returncode == 0, first.stderr
    assert "144 computed now" in first.stdout
    before = table_bytes(tmp_path / "out")
    again = run("sweep", study, "--out", tmp_path / "out", "--workers", "1")
    assert "0 computed now" in again.stdout
    assert table_bytes(tmp_path / "out") == before


def test_a_changed_study_computes_only_what_is_new(tmp_path: Path) -> None:
    study = write_study(tmp_path / "study.toml")
    run("sweep", study, "--out", tmp_path / "out", "--workers", "1")
    write_study(study, compositions="[0.0, 0.3, 0.5, 0.7]")
    more = run("sweep", study, "--out", tmp_path / "out", "--workers", "1")
    assert "192 states" in more.stdout
    assert "48 computed now" in more.stdout


def batches(log: Path) -> list[str]:
    """Work units begun so far, by their first key."""
    return log.read_text().split() if log.exists() else []


def test_killed_ten_times_and_resumed_gives_the_same_table_bit_for_bit(tmp_path: Path) -> None:
    """Ten kills -9, each at a random moment after the sweep has begun to work and before it is done."""
    study = write_study(tmp_path / "study.toml", SIZES, MANY)
    states = len(read_study(study).cases)
    assert states > 2000
    assert run("sweep", study, "--out", tmp_path / "calm", "--workers", "2").returncode == 0
    rng = random.Random(20261201)
    log, results = tmp_path / "log", tmp_path / "rough"
    stored, found_working, lost = 0, 0, []
    for _ in range(KILLS):
        log.unlink(missing_ok=True)
        process = subprocess.Popen(
            [sys.executable, "-m", "tests.localcomp.logged_sweep", str(study), str(results), str(log)],
            stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL,
        )  # fmt: skip
        deadline = time.monotonic() + 60
        while not batches(log) and process.poll() is None and time.monotonic() < deadline:
            time.sleep(0.005)
        time.sleep(rng.uniform(0.0, 0.25))
        found_working += process.poll() is None
        process.send_signal(signal.SIGKILL)
        process.wait()
        time.sleep(0.7)  # its workers notice within half a second
        with Store(results / "states.sqlite") as store:
            known = store.known()
        assert len(known) >= stored
        stored = len(known)
        lost.append(sum(key not in known for key in batches(log)))
    assert found_working == KILLS
    assert 0 < stored < states
    assert max(lost) <= 2 * WORKERS  # a batch in work each, and for milliseconds one just handed over
    assert sum(lost) <= KILLS * WORKERS
    last = run("sweep", study, "--out", results, "--workers", "2")
    assert last.returncode == 0, last.stderr
    computed = int(last.stdout.split(" computed now")[0].rsplit(" ", 1)[-1])
    assert computed == states - stored  # nothing stored is computed again
    assert table_bytes(results) == table_bytes(tmp_path / "calm")


def test_an_interrupt_keeps_what_is_stored(tmp_path: Path) -> None:
    study = write_study(tmp_path / "study.toml", SIZES, MANY)
    process = subprocess.Popen(
        command("sweep", study, "--out", tmp_path / "out", "--workers", "2"),
        stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True,
    )  # fmt: skip
    store = tmp_path / "out" / "states.sqlite"
    deadline = time.monotonic() + 60
    while time.monotonic() < deadline:
        time.sleep(0.05)
        if store.exists() and store.stat().st_size > 100_000:
            break
    process.send_signal(signal.SIGINT)
    _, errors = process.communicate(timeout=60)
    assert process.returncode == 130
    assert "Traceback" not in errors
    assert "resumes" in errors
    with Store(store) as kept:
        assert len(kept.known()) > 0


def test_two_sweeps_on_one_store_at_once(tmp_path: Path) -> None:
    study = write_study(tmp_path / "study.toml", SIZES, "[0.1, 0.5, 0.9]")
    both = [
        subprocess.Popen(
            command("sweep", study, "--out", tmp_path / "out", "--workers", "1"),
            stdout=subprocess.DEVNULL, stderr=subprocess.PIPE, text=True,
        )
        for _ in range(2)
    ]  # fmt: skip
    for process in both:
        _, errors = process.communicate(timeout=120)
        assert process.returncode == 0, errors
    run("sweep", study, "--out", tmp_path / "alone", "--workers", "1")
    assert table_bytes(tmp_path / "out") == table_bytes(tmp_path / "alone")


def test_a_worker_pool_and_this_process_agree_bit_for_bit(tmp_path: Path) -> None:
    study = read_study(write_study(tmp_path / "study.toml", SIZES, "[0.2, 0.8]"))
    tables = []
    for name, executor in (("a", None), ("b", SerialExecutor())):
        with Store(tmp_path / f"{name}.sqlite") as store:
            if executor is None:
                with pool(2) as workers:
                    run_sweep(study, store, workers, 2)
            else:
                run_sweep(study, store, executor, 1)
            tables.append(list(store.results(study.keys())))
    assert tables[0] == tables[1]


def test_a_state_without_solution_is_a_row_with_its_reason(tmp_path: Path) -> None:
    path = tmp_path / "study.toml"
    path.write_text(
        "[class]\nsize_ratio = 1\nenergy_ratio = 1\nk = 0.2\n[conditions]\ntemperature = [1.0, 2.0]\n"
        'packing_fraction = 0.4\ncomposition = 0.5\nclosures = ["py"]\n'
    )
    assert run("sweep", path, "--out", tmp_path / "out", "--workers", "1").returncode == 0
    rows = list(csv.DictReader(io.StringIO(table_bytes(tmp_path / "out").decode())))
    failed = [row for row in rows if row["reduced_temperature"] == "1.0"]
    assert len(failed) == 4
    assert all(row["status"] == "branch_end" and "followed from hard spheres" in row["message"] for row in failed)
    assert all(row["coordination_number"] == "" for row in failed)
    assert all(row["status"] == "solved" for row in rows if row["reduced_temperature"] == "2.0")


def test_a_full_disk_ends_with_a_clear_message(tmp_path: Path) -> None:
    import resource

    study = write_study(tmp_path / "study.toml", SIZES, MANY)

    def small_files() -> None:
        signal.signal(signal.SIGXFSZ, signal.SIG_IGN)  # a write past the limit then fails with EFBIG
        resource.setrlimit(resource.RLIMIT_FSIZE, (600_000, 600_000))

    done = subprocess.run(
        command("sweep", study, "--out", tmp_path / "out", "--workers", "1"),
        capture_output=True, text=True, timeout=120, preexec_fn=small_files, check=False,
    )  # fmt: skip
    assert done.returncode == 1
    assert "Traceback" not in done.stderr
    assert "what was stored is safe" in done.stderr
    with Store(tmp_path / "out" / "states.sqlite") as store:
        kept = set(store.known())
    assert len(kept) > 0
    assert run("sweep", study, "--out", tmp_path / "out", "--workers", "2").returncode == 0
    with Store(tmp_path / "out" / "states.sqlite") as store:
        assert kept < set(store.known())


def test_check_counts_and_estimates(tmp_path: Path) -> None:
    study = write_study(tmp_path / "study.toml", SIZES, "[0.1, 0.5, 0.9]")
    done = run("check", study, "--workers", "1")
    assert done.returncode == 0, done.stderr
    assert "288 states" in done.stdout
    promised = float(done.stdout.split("about ")[1].split(" s")[0])
    began = time.monotonic()
    run("sweep", study, "--out", tmp_path / "out", "--workers", "1")
    taken = time.monotonic() - began
    assert promised / 4 < taken < 4 * promised + 3.0  # honest: within a factor, start-up aside


def test_a_dead_worker_ends_with_a_sentence(tmp_path: Path) -> None:
    """A worker of the local pool that is killed breaks the pool; what was stored stays."""
    study = write_study(tmp_path / "study.toml", SIZES, MANY)
    process = subprocess.Popen(
        command("sweep", study, "--out", tmp_path / "out", "--workers", "2"),
        stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True,
    )  # fmt: skip
    children: list[str] = []
    deadline = time.monotonic() + 30
    while len(children) < 3 and time.monotonic() < deadline:
        time.sleep(0.05)
        listing = Path(f"/proc/{process.pid}/task/{process.pid}/children")
        children = listing.read_text().split() if listing.exists() else []
    if not children:
        pytest.fail("no worker processes seen")
    time.sleep(0.6)
    subprocess.run(["kill", "-9", children[-1]], check=False)
    _, errors = process.communicate(timeout=120)
    assert "Traceback" not in errors
    if process.returncode != 0:  # the last unit may have been stored before the worker died
        assert "worker" in errors
    assert run("sweep", study, "--out", tmp_path / "out", "--workers", "2").returncode == 0


def test_a_worker_that_dies_while_it_answers_does_not_hang_the_pool(monkeypatch: pytest.MonkeyPatch) -> None:
    """Half a message stays in the pool's pipe; without the watch the pool waits for the rest for ever."""
    monkeypatch.setattr(executors, "STUCK_SECONDS", 0.5)
    with executors.pool(2) as executor:
        wait([executor.submit(short_work) for _ in range(4)])
        lost = executor.submit(half_a_result)
        others = [executor.submit(short_work) for _ in range(3)]
        with pytest.raises(BrokenExecutor):
            lost.result(timeout=30)
        assert all(isinstance(other.exception(timeout=30), BrokenExecutor | None) for other in others)


def test_lost_work_is_bounded() -> None:
    assert AHEAD * UNIT_SIZE <= 512


def test_results_say_whether_they_have_numbers() -> None:
    assert is_solved({"status": "solved", **dict.fromkeys(NUMBERS)})
    with pytest.raises(StoreError, match="virial_z"):
        is_solved({"status": "solved", **dict.fromkeys(NUMBERS - {"virial_z"})})
    assert not is_solved({"status": "branch_end"})


class Gone(Executor):
    """Cancels all it is given, as a cluster client does when its scheduler is gone."""

    def submit(self, fn: Any, /, *args: Any, **kwargs: Any) -> Future[Any]:
        future: Future[Any] = Future()
        future.cancel()
        future.set_running_or_notify_cancel()
        return future


def test_a_scheduler_that_is_gone_ends_with_a_sentence(tmp_path: Path) -> None:
    study = read_study(write_study(tmp_path / "study.toml"))
    with Store(tmp_path / "s.sqlite") as store, pytest.raises(WorkerLost, match="scheduler is gone"):
        run_sweep(study, store, Gone(), 1)
