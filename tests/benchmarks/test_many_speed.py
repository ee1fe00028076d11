"""Rates of batches and sweeps, as ratios in one run.

Run with `pytest tests/benchmarks -s`; not collected by default. A class of 2,160 binary liquids: size
ratios 1-2, energy ratios 1-2, k 0-0.2, five temperatures, nine compositions, packing fraction 0.40.
"""

from __future__ import annotations

import platform
import resource
import time
from pathlib import Path

import numpy as np
import pytest

from localcomp.executors import SerialExecutor, pool
from localcomp.neighbors import count_neighbors
from localcomp.store import Store
from localcomp.study import read_study
from localcomp.sweep import Unit, run, units, work
from ozsolve import Mixture, Solution, State, solve, solve_many
from ozsolve.grid import Grid
from tests.benchmarks.test_solve_speed import bare_seconds, picard_baseline

AT_LEAST_RATE = 1000.0
AT_LEAST_PICARD = 300.0
AT_MOST_TRANSFORMS = 3.0
AT_MOST_DRIFT = 0.15
AT_MOST_MEGABYTES = 500.0
AT_MOST_POWER = 2.3
AT_LEAST_TWO_WORKERS = 1.8
AT_MOST_OVERHEAD = 0.10

STUDY = """\
[class]
size_ratio = [1.0, 1.25, 1.5, 2.0]
energy_ratio = [1.0, 1.5, 2.0]
k = [0.0, 0.05, 0.1, 0.2]
[conditions]
temperature = [1.5, 1.8, 2.2, 2.8, 4.0]
temperature_reference = "mean"
packing_fraction = 0.40
composition = [0.01, 0.1, 0.25, 0.4, 0.5, 0.6, 0.75, 0.9, 0.99]
closures = ["{closure}"]
"""


def study(folder: Path, closure: str = "rhnc"):
    path = folder / f"{closure}.toml"
    path.write_text(STUDY.format(closure=closure))
    return read_study(path)


def say(capsys: pytest.CaptureFixture[str], text: str) -> None:
    with capsys.disabled():
        print(f"\n{text}", end="")


def cases_of(found) -> list[tuple[Mixture, State]]:
    return [(case.mixture, case.state) for case in found.cases]


def timed_sweep(folder: Path, closure: str, workers: int) -> tuple[float, int]:
    """Seconds of a sweep in a pool that is already running (its start is not the engine's speed)."""
    found = study(folder, closure)
    target = folder / f"{closure}{workers}.sqlite"
    with pool(workers) as executor, Store(target) as store:
        warm = Unit(closure, found.accuracy, found.rule, ("a",), (cases_of(found)[0],))
        for future in [executor.submit(work, warm) for _ in range(4 * workers)]:
            future.result()
        began = time.perf_counter()
        result = run(found, store, executor, workers)
        return time.perf_counter() - began, result.total


@pytest.mark.parametrize("closure", ["rhnc", "msa", "py"])
def test_rate_on_two_cores(closure: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    seconds, states = timed_sweep(tmp_path, closure, 2)
    say(capsys, f"{closure}: {states / seconds:.0f} states a second on 2 processes ({platform.processor()})")
    assert states / seconds >= AT_LEAST_RATE


def test_two_workers_against_one(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    ratios = []
    for n in range(2):
        alone, both = tmp_path / f"{n}a", tmp_path / f"{n}b"
        alone.mkdir()
        both.mkdir()
        ratios.append(timed_sweep(alone, "rhnc", 1)[0] / timed_sweep(both, "rhnc", 2)[0])
    say(capsys, f"two workers: {max(ratios):.2f} times one")
    assert max(ratios) >= AT_LEAST_TWO_WORKERS


def test_against_picard_and_bare_transforms(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    cases = cases_of(study(tmp_path))
    solve_many(cases[:200])
    began = time.process_time()
    found = solve_many(cases)
    per_state = (time.process_time() - began) / len(cases)
    bare = np.mean([bare_of(solution) for solution in found])
    mixture, state = Mixture([1.0, 1.5], [1.0, 1.5], k=0.1), State(2.0, (0.5, 0.5), packing_fraction=0.40)
    truth = solve(mixture, state, accuracy=1e-9).observables.shell_integral[np.triu_indices(2)]
    picard_seconds, *_ = picard_baseline("rhnc", truth)
    say(
        capsys,
        f"one core: {1e3 * per_state:.2f} ms a state; Picard {picard_seconds / per_state:.0f} times; "
        f"bare transforms 1/{per_state / bare:.2f}",
    )
    assert picard_seconds / per_state >= AT_LEAST_PICARD
    assert per_state / bare <= AT_MOST_TRANSFORMS


def bare_of(solution: Solution) -> float:
    """Seconds of the transforms one state's steps need (coarse ones counted as fine: the record has the sum)."""
    points = solution.stats.grid_points
    if points not in BARE:
        BARE[points] = bare_seconds(Grid(solution.stats.spacing, points))
    return solution.stats.steps * BARE[points] * 0.75


BARE: dict[int, float] = {}


def spread_class(count: int) -> list[tuple[Mixture, State]]:
    """`count` states: families of twenty, over many sizes and compositions."""
    rng = np.random.default_rng(count)
    out: list[tuple[Mixture, State]] = []
    while len(out) < count:
        size, x = float(rng.uniform(1.0, 1.5)), float(rng.uniform(0.05, 0.95))
        for k in (0.0, 0.05, 0.1, 0.15):
            for t in (1.8, 2.1, 2.5, 3.0, 4.0):
                out.append((Mixture([1.0, size], [1.0, 1.4], k=k), State(t, (x, 1 - x), packing_fraction=0.4)))
    return out[:count]


def test_time_per_state_does_not_grow(capsys: pytest.CaptureFixture[str]) -> None:
    solve_many(spread_class(100))
    per_state = {}
    for count in (100, 1000, 10_000):
        cases = spread_class(count)
        repeats = max(1, 1000 // count)
        began = time.process_time()
        for _ in range(repeats):
            for start in range(0, count, 500):
                solve_many(cases[start : start + 500])
        per_state[count] = (time.process_time() - began) / count / repeats
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    drift = per_state[10_000] / per_state[100] - 1.0
    say(capsys, f"10^2 to 10^4 states: time per state {100 * drift:+.0f} %, peak memory {peak:.0f} MB")
    assert abs(drift) <= AT_MOST_DRIFT or drift < 0
    assert peak <= AT_MOST_MEGABYTES


def test_growth_with_species(capsys: pytest.CaptureFixture[str]) -> None:
    seconds = {}
    for species in (2, 3, 4, 5):
        rng = np.random.default_rng(species)
        sigma = np.linspace(1.0, 1.5, species)
        cases = [
            (Mixture(sigma, np.linspace(1.0, 1.5, species), k=k), State(t, tuple(x / x.sum()), packing_fraction=0.4))
            for x in (rng.uniform(0.5, 1.0, species) for _ in range(6))
            for k in (0.0, 0.05, 0.1, 0.15)
            for t in (1.8, 2.1, 2.5, 3.0, 4.0)
        ]
        solve_many(cases[:20])
        began = time.process_time()
        solve_many(cases)
        seconds[species] = time.process_time() - began
    power = float(np.polyfit(np.log(list(seconds)), np.log(list(seconds.values())), 1)[0])
    say(capsys, f"2 to 5 species: time grows as n^{power:.2f}")
    assert power <= AT_MOST_POWER


def test_sweep_overhead(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Store, hashing and progress against solving the states and counting their neighbours."""
    found = study(tmp_path)
    solving, counting, whole = [], [], []
    for turn in range(2):
        engine = neighbors = 0.0
        for _, cases in units(found):
            began = time.perf_counter()
            pairs = [(case.mixture, case.state) for case in cases]
            solutions = solve_many(pairs, closure=cases[0].closure, accuracy=found.accuracy)
            middle = time.perf_counter()
            for solution in solutions:
                count_neighbors(solution, found.rule)
            engine += middle - began
            neighbors += time.perf_counter() - middle
        solving.append(engine)
        counting.append(neighbors)
        with Store(tmp_path / f"{turn}.sqlite") as store:
            began = time.perf_counter()
            run(found, store, SerialExecutor(), 1, lambda *_: None)
            whole.append(time.perf_counter() - began)
    engine, neighbors, total = min(solving), min(counting), min(whole)
    overhead = (total - engine - neighbors) / engine
    say(
        capsys,
        f"sweep: store, hashing and progress {100 * overhead:.1f} % of solving; with the neighbours themselves "
        f"{100 * (total / engine - 1.0):.1f} %",
    )
    assert overhead <= AT_MOST_OVERHEAD
