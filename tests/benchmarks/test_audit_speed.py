"""An audit of 2,000 states, sweep included, against solving its states one by one; run with -s."""

from __future__ import annotations

import time
from pathlib import Path

import pytest

from localcomp.audit import run_audit
from localcomp.auditplan import plan_audit, solve_plan
from localcomp.executors import pool
from localcomp.standing import standings
from localcomp.store import Store
from localcomp.study import read_study
from localcomp.templates import STUDY_TOML
from ozsolve import solve

AT_MOST_SECONDS = 60.0
SAMPLE = 40


def test_audit_of_two_thousand_states(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = tmp_path / "study.toml"
    path.write_text(STUDY_TOML.replace("steps = 4", "steps = 8"))
    study = read_study(path)
    assert len(study.cases) > 2000
    began = time.perf_counter()
    plan = plan_audit(study, study.audit)
    with Store(tmp_path / "states.sqlite") as store, pool(2) as executor:
        findings = solve_plan(plan, store, executor, 2)
    solved = time.perf_counter() - began
    first, *others = plan.closures
    audit = run_audit(findings[first], study.audit, first, {c: findings[c] for c in others})
    standings(audit)
    whole = time.perf_counter() - began
    total = sum(len(part.cases) for part in plan.studies())
    chosen = study.cases[:: len(study.cases) // SAMPLE]
    began = time.perf_counter()
    for case in chosen:
        solve(case.mixture, case.state, closure=case.closure, on_failure="return")
    single = (time.perf_counter() - began) / len(chosen) * total
    with capsys.disabled():
        print(
            f"\naudit of {len(study.cases)} states ({total} solves): {whole:.1f} s on two processes, of it judging "
            f"{whole - solved:.1f} s; the same states one by one on one: {single:.0f} s, {single / whole:.1f} times"
        )
    assert whole < AT_MOST_SECONDS
