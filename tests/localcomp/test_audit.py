"""The audit on solved states: known facts, the low-density limit, settings, the command, and what it writes."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from localcomp.audit import Audit, Outcome, decide, multiplicity, run_audit
from localcomp.auditplan import plan_audit, read_findings, solve_plan, study_of_state
from localcomp.auditsettings import AuditSettings, companions_of
from localcomp.audittables import neighbors_csv
from localcomp.claims import CLAIMS, from_middle
from localcomp.errors import BadInput
from localcomp.evidence import Findings, log_ratio
from localcomp.executors import SerialExecutor
from localcomp.inputs import read_state
from localcomp.models import Claim, ModelInput, QuasiChemical, Reading, excess_energy
from localcomp.models.lsg import LatticeSurface
from localcomp.models.uniquac import Uniquac
from localcomp.neighbors import count_neighbors
from localcomp.standing import standings
from localcomp.store import Store
from localcomp.study import Study, read_study
from ozsolve import Mixture, State, solve
from tests.localcomp.state_files import STATE, TERNARY
from tests.readers import numbers, read

STUDY = """\
[class]
size_ratio = {sizes}
energy_ratio = {energies}
k = {k}
[conditions]
temperature = {temperatures}
packing_fraction = {packing}
composition = [0.0, 0.3, 1.0]
[numerics]
accuracy = 1e-4
"""


PAIR = "[pair]\nnames = ['a', 'b']\ndiameter = [1.0, 1.3]\nwell_depth = [0.0, 0.0]"


def study_text(
    sizes: str = "[1.0, 1.4]", energies: str = "[1.0, 1.6]", k: str = "[0.05]", temperatures: str = "[2.0, 3.0]",
    packing: str = "[0.35, 0.4]",
) -> str:  # fmt: skip
    return STUDY.format(sizes=sizes, energies=energies, k=k, temperatures=temperatures, packing=packing)


def audited(study: Study, folder: Path, settings: AuditSettings | None = None) -> tuple[Audit, dict[str, Findings]]:
    settings = settings or study.audit
    plan = plan_audit(study, settings)
    with Store(folder / "states.sqlite") as store:
        findings = solve_plan(plan, store, SerialExecutor(), 1)
    first, *others = plan.closures
    return run_audit(findings[first], settings, first, {c: findings[c] for c in others}), findings


@pytest.fixture(scope="module")
def small(tmp_path_factory: pytest.TempPathFactory) -> tuple[Audit, dict[str, Findings], Study]:
    folder = tmp_path_factory.mktemp("audit")
    path = folder / "study.toml"
    path.write_text(study_text(), encoding="utf-8")
    study = read_study(path)
    return *audited(study, folder), study


# --- facts -------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("x1", [0.0, 1.0])
def test_size_alone_governs_ratios_of_equal_energies_at_infinite_dilution(x1: float) -> None:
    """Common practice, no source. Within the audit's own tolerance at T* = 2.5, sizes 1 and 1.5."""
    state = State(2.5, (x1, 1.0 - x1), packing_fraction=0.4)

    def ln_ratio(mixture: Mixture) -> np.ndarray:
        return np.log(count_neighbors(solve(mixture, state)).neighbor_ratios)[[0, 1], [1, 0]]

    equal = Mixture([1.0, 1.5], [1.0, 1.0])
    bare = ln_ratio(equal.athermal())
    assert np.max(np.abs(ln_ratio(equal) - bare)) < 0.05
    assert np.min(np.abs(bare)) > 0.4
    unlike = ln_ratio(Mixture([1.0, 1.5], [1.0, 1.0], k=0.5))
    assert np.max(np.abs(unlike - bare)) > 0.1, "unlike energies must be seen"


def test_sign_of_the_excess_energy_against_the_solver() -> None:
    """Common practice, no source: k = 0, eps ratio 2, equal sizes, T* = 2.5. UNIQUAC with m = z/2 has the wrong sign,
    the quasi-chemical theory and LSG the right one."""
    mixture, temperature = Mixture([1.0, 1.0], [1.0, 2.0]), 2.5
    energy = [
        solve(mixture, State(temperature, (x, 1.0 - x), packing_fraction=0.4)).internal_energy for x in (0.0, 0.5, 1.0)
    ]
    true = energy[1] - 0.5 * (energy[0] + energy[2])
    assert true > 0.0
    given = ModelInput.of(mixture, State(temperature, (0.5, 0.5), packing_fraction=0.4))
    assert float(excess_energy(Uniquac(), given, Reading.ALL_CONTACTS)) < 0.0
    assert float(excess_energy(LatticeSurface(), given, Reading.ONE_CONTACT)) > 0.0
    assert float(excess_energy(QuasiChemical(), given, Reading.ONE_CONTACT)) > 0.0


def product(mixture: Mixture, temperature: float) -> float:
    ratios = count_neighbors(solve(mixture, State(temperature, (0.5, 0.5), packing_fraction=0.4))).neighbor_ratios
    return float(ratios[0, 1] * ratios[1, 0])


def test_quasi_chemical_invariant_against_the_solver() -> None:
    """R_12 R_21 = exp[beta (2 eps_12 - eps_11 - eps_22)] (Guggenheim 1952), equal sizes and depths, k = 0.2: reached at
    high temperature, left on cooling, when like molecules cluster more than the invariant allows."""
    mixture = Mixture([1.0, 1.0], [1.0, 1.0], k=0.2)
    off = [np.log(product(mixture, t)) / (-0.4 / t) for t in (20.0, 5.0, 2.0, 1.5)]
    assert off[0] == pytest.approx(1.0, abs=0.02)
    assert off == sorted(off)
    assert off[-1] > 1.3


def test_quasi_chemical_invariant_against_simulation() -> None:
    """Own canonical Monte Carlo, another program (tests/data/sw_monte_carlo.csv, run M2a: eps 1, 1, 0.75, T* = 1.5,
    rho* = 0.6): the solver's product is the simulated one within the runs' errors, the invariant's is not."""
    row = numbers(next(r for r in read("sw_monte_carlo") if r["run"] == "M2a"))
    like = row["n11"] * (1.0 + 1.0 / row["N1"])  # closed box: like pairs are low by about 1/N_i
    simulated = (row["n12"] / like) ** 2
    state = State(1.5, (0.5, 0.5), density=0.6)
    ratios = count_neighbors(solve(Mixture([1.0, 1.0], [1.0, 1.0], k=0.25), state)).neighbor_ratios
    assert ratios[0, 1] * ratios[1, 0] == pytest.approx(simulated, rel=0.02)
    assert abs(np.exp(-0.5 / 1.5) / simulated - 1.0) > 0.08


def test_a_nearly_ideal_gas_obeys_one_contact(tmp_path: Path) -> None:
    """At zero density R_ij is the ratio of shell volumes times a Boltzmann factor of one contact, exactly (second
    virial coefficient: Hirschfelder, Curtiss and Bird, Molecular Theory of Gases and Liquids, 1954, chapter 3)."""
    path = tmp_path / "gas.toml"
    path.write_text(
        study_text(temperatures="[1.5, 3.0]", packing="[1e-5, 2e-5]").replace("1e-4", "1e-6"), encoding="utf-8"
    )
    audit, findings = audited(read_study(path), tmp_path)
    exponent = multiplicity(findings["rhnc"])
    found = exponent[np.isfinite(exponent)]
    assert found == pytest.approx(1.0, abs=2e-3)
    outcome = {(v.model.name, v.reading, v.test.claim): v.outcome for v in audit.verdicts}
    one = Reading.ONE_CONTACT
    assert outcome["wilson", one, Claim.BOLTZMANN] is Outcome.HOLDS
    assert outcome["uniquac", one, Claim.BOLTZMANN] is Outcome.HOLDS
    assert outcome["random-pair-volume", Reading.ALL_CONTACTS, Claim.ATHERMAL_LIMIT] is Outcome.HOLDS
    assert outcome["wilson", Reading.ALL_CONTACTS, Claim.BOLTZMANN] is Outcome.FAILS
    assert outcome["uniquac", one, Claim.ATHERMAL_LIMIT] is Outcome.FAILS, "shell volumes, not surfaces"


# --- findings ----------------------------------------------------------------------------------------------


def test_findings_are_what_the_solver_gives(small: tuple[Audit, dict[str, Findings], Study]) -> None:
    audit, findings, study = small
    table = findings["rhnc"].main
    assert audit.failed_states == 0
    for n in (0, 7, len(study.cases) - 1):
        case = study.cases[n]
        solution = solve(case.mixture, case.state, closure="rhnc", accuracy=1e-6)
        neighbors = count_neighbors(solution)
        assert np.exp(table.ln_ratio[n]) == pytest.approx(neighbors.neighbor_ratios, rel=3e-4)
        assert table.counts[n] * table.mole_fractions[n] == pytest.approx(neighbors.coordination_numbers, rel=3e-4)
        bare = count_neighbors(solve(case.mixture.athermal(), case.state, closure="rhnc"))
        assert np.exp(log_ratio(findings["rhnc"].athermal[n])) == pytest.approx(bare.neighbor_ratios, rel=3e-4)
        x = table.mole_fractions[n]
        energy = -0.5 * (x[:, None] * x[None, :] * table.well_counts[n] * table.depth[n]).sum()
        assert energy == pytest.approx(solution.internal_energy, rel=3e-4)


def test_ternaries_are_held_against_their_own_binaries(small: tuple[Audit, dict[str, Findings], Study]) -> None:
    _, findings, study = small
    found = findings["rhnc"]
    plan = plan_audit(study, study.audit)
    assert found.ternary is not None
    assert found.binary is not None
    case = plan.ternary[1]
    x = case.state.mole_fractions
    eta = case.mixture.packing_fraction(case.state)
    pair = solve(
        case.mixture.subset((0, 2)),
        State(case.state.temperature, (x[0] / (x[0] + x[2]), x[2] / (x[0] + x[2])), packing_fraction=eta),
    )
    ratios = count_neighbors(pair).neighbor_ratios
    assert np.exp(found.binary[1][[0, 2], [2, 0]]) == pytest.approx(ratios[[0, 1], [1, 0]], rel=3e-4)
    assert found.ternary.solved.all()


def test_a_second_audit_solves_nothing(small: tuple[Audit, dict[str, Findings], Study], tmp_path: Path) -> None:
    _, _, study = small
    plan = plan_audit(study, study.audit)
    calls: list[tuple[int, int, int]] = []
    with Store(tmp_path / "states.sqlite") as store:
        solve_plan(plan, store, SerialExecutor(), 1)

        class Idle(SerialExecutor):
            def submit(self, *_: object, **__: object) -> object:  # type: ignore[override]
                raise AssertionError("nothing is left to solve")

        again = solve_plan(plan, store, Idle(), 1, lambda *seen: calls.append(seen))
        assert np.array_equal(again["rhnc"].main.counts, read_findings(plan, store)["rhnc"].main.counts)
    assert calls[-1][0] == calls[-1][1]


def test_failed_states_are_counted_and_left_out(tmp_path: Path) -> None:
    path = tmp_path / "cold.toml"
    path.write_text(study_text(sizes="[1.0]", k="[0.3]", temperatures="[0.7, 3.0]"), encoding="utf-8")
    audit, _ = audited(read_study(path), tmp_path)
    assert 0 < audit.failed_states < audit.states
    assert all(np.isfinite(v.deviation) for v in audit.verdicts if v.test.claim is Claim.BOLTZMANN)


def test_a_class_with_nothing_to_compare_says_so(tmp_path: Path) -> None:
    path = tmp_path / "one.toml"
    path.write_text(
        '[pair]\nnames = ["a", "b"]\ndiameter = [1, 1.2]\nwell_depth = [1, 1.5]\n[conditions]\ntemperature = 2.0\n'
        "packing_fraction = 0.4\ncomposition = 0.5\n",
        encoding="utf-8",
    )
    audit, _ = audited(read_study(path), tmp_path)
    reasons = {v.test.claim: v for v in audit.verdicts}
    for claim in (Claim.COMPOSITION_FREE, Claim.DENSITY_FREE, Claim.TERNARY):
        assert reasons[claim].outcome is Outcome.UNDECIDED
        assert "one" in reasons[claim].reason


# --- rules -------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("difference", "doubt", "expected"),
    [
        ([0.04, 0.01], [0.005, 0.0], Outcome.HOLDS),
        ([0.04, 0.01], [0.02, 0.0], Outcome.UNDECIDED),
        ([0.12], [0.01], Outcome.STRAINED),
        ([0.14], [0.02], Outcome.UNDECIDED),
        ([0.3], [0.1], Outcome.FAILS),
        ([0.3, 0.12], [0.2, 0.0], Outcome.UNDECIDED),
        ([0.3, 0.4], [0.2, 0.01], Outcome.FAILS),
    ],
)
def test_verdicts_follow_the_worst_difference(difference: list[float], doubt: list[float], expected: Outcome) -> None:
    assert decide(np.array(difference), np.array(doubt), 0.05) is expected


def test_ranges_are_measured_from_their_middle() -> None:
    values = np.array([[1.0], [3.0], [np.nan], [5.0], [7.0]])
    found = from_middle(values, np.array([0, 0, 0, 1, 2]))
    assert found[:2, 0].tolist() == [-1.0, 1.0]
    assert np.isnan(found[2:, 0]).all()


def test_a_state_without_solution_fails_no_claim(small: tuple[Audit, dict[str, Findings], Study]) -> None:
    """Wells may take a state's solution away and leave the one without wells: its error is then not known."""
    _, findings, study = small
    full = findings["rhnc"]
    main = {name: getattr(full.main, name).copy() for name in ("counts", "well_counts", "error")}
    for values in main.values():
        values[0] = np.nan
    short = replace(full, main=replace(full.main, **main))
    claim = Claim.ATHERMAL_LIMIT

    def outcomes(found: Findings) -> list[Outcome]:
        return [v.outcome for v in run_audit(found, study.audit).verdicts if v.test.claim is claim]

    assert outcomes(short) == outcomes(full)
    assert set(outcomes(full)) > {Outcome.FAILS}
    nothing = replace(full.main, **{name: np.full_like(values, np.nan) for name, values in main.items()})
    assert set(outcomes(replace(full, main=nothing))) == {Outcome.UNDECIDED}
    reasons = {v.reason for v in run_audit(replace(full, main=nothing, ternary=None), study.audit).verdicts}
    assert "not tested: no state has a solution" in reasons
    assert not any("energies this large" in reason for reason in reasons)


def test_a_class_without_any_solution_is_reported(
    run: Callable[..., object], write: Callable[..., Path], tmp_path: Path
) -> None:
    text = study_text(sizes="[1.0]", energies="[1.0]", k="[0.6]", temperatures="[0.02]", packing="[0.4]")
    path = write(text.replace("[0.0, 0.3, 1.0]", "[0.5]") + '[audit]\nz = "measured"\n', "study.toml")
    ran = run("audit", path, "--out", tmp_path / "out", "--json", "--workers", 1)
    assert ran.status == 3  # type: ignore[attr-defined]
    assert "none of the 1 states has a physical solution under rhnc" in ran.err  # type: ignore[attr-defined]


def test_hard_spheres_test_no_claim_about_attraction(tmp_path: Path) -> None:
    path = tmp_path / "hard.toml"
    path.write_text(study_text(energies="[1.0]").replace("[class]", PAIR) + "", encoding="utf-8")
    text = path.read_text(encoding="utf-8")
    keep = [line for line in text.splitlines() if not line.startswith(("size_ratio", "energy_ratio", "k ="))]
    path.write_text("\n".join(keep), encoding="utf-8")
    audit, _ = audited(read_study(path), tmp_path)
    reasons = {v.test.claim: v.reason for v in audit.verdicts if v.reason.startswith("not tested")}
    assert {Claim.BOLTZMANN, Claim.ENERGY} <= set(reasons)


def test_an_undecided_claim_is_no_survival(small: tuple[Audit, dict[str, Findings], Study]) -> None:
    audit, _, _ = small
    only = tuple(
        replace(v, outcome=Outcome.UNDECIDED if v.test.claim is Claim.BOLTZMANN else Outcome.HOLDS)
        for v in audit.verdicts
    )
    assert not any(s.survives for s in standings(replace(audit, verdicts=only)))
    held = tuple(replace(v, outcome=Outcome.HOLDS) for v in audit.verdicts)
    assert all(s.survives for s in standings(replace(audit, verdicts=held)))


def test_one_segment_for_a_class(tmp_path: Path) -> None:
    """The same sphere has the same surface whatever it is mixed with."""
    path = tmp_path / "sizes.toml"
    path.write_text(study_text(sizes="[0.8, 1.25]", energies="[1.0]"), encoding="utf-8")
    _, findings = audited(read_study(path), tmp_path)
    table = findings["rhnc"].main
    given = table.given(10.0)
    first = given.surface[:, 0]
    assert np.ptp(first) < 1e-12
    assert first[0] == pytest.approx((1.0 / 0.8) ** 2)


def test_a_state_file_may_say_how_it_is_judged(write: Callable[..., Path]) -> None:
    request = read_state(write(STATE + "[audit]\nz = 12\n[audit.tolerances]\nproduct = 0.2\n"))
    settings = study_of_state(request).audit
    assert settings.z == 12.0
    assert settings.tolerance("product") == 0.2


def test_closures_need_not_answer_the_same_shell_rules(
    small: tuple[Audit, dict[str, Findings], Study], tmp_path: Path
) -> None:
    """A rule without an answer under one closure, as the first minimum of a repulsive mixture may be."""
    _, findings, study = small
    with Store(tmp_path / "empty.sqlite") as store:
        unanswered = read_findings(plan_audit(study, study.audit), store)["hnc"]
    other = replace(findings["hnc"], rules=unanswered.rules)
    for judged, companion in ((findings["rhnc"], other), (other, findings["rhnc"])):
        verdicts = run_audit(judged, study.audit, "", {"hnc": companion}).verdicts
        outcomes = {v.outcome for v in verdicts if v.test.claim is Claim.SHELL_RULE}
        assert (outcomes == {Outcome.UNDECIDED}) is (judged is other)


MIXTURES = """\
[[mixtures]]
names = ["argon", "krypton"]
diameter = [1.0, 1.1]
well_depth = [1.0, 1.4]
[[mixtures]]
names = ["methane", "xenon"]
diameter = [1.0, 1.3]
well_depth = [1.0, 1.4]
[conditions]
temperature = [2.0]
packing_fraction = [0.35]
mole_fractions = [[0.5, 0.5]]
[numerics]
accuracy = 1e-4
"""


def test_every_mixture_keeps_its_own_names(write: Callable[..., Path], tmp_path: Path) -> None:
    study = read_study(write(MIXTURES, "study.toml"))
    audit, _ = audited(study, tmp_path)
    for row in csv.DictReader(io.StringIO(neighbors_csv(audit, study))):
        assert {row["center"], row["neighbor"]} <= set(row["mixture"].split(" + "))
    worst = [v.worst_state for v in audit.verdicts if "neighbor" in v.worst_state]
    assert worst
    assert all({w["center"], w["neighbor"]} == set(w["mixture"].split(" + ")) for w in worst)


def test_z_can_be_measured(small: tuple[Audit, dict[str, Findings], Study]) -> None:
    _, findings, study = small
    audit = run_audit(findings["rhnc"], replace(study.audit, z=None))
    assert audit.z == pytest.approx(audit.z_measured)
    assert 8.0 < audit.z < 14.0
    given = run_audit(findings["rhnc"], replace(study.audit, z=12.0))
    assert given.z == 12.0
    name, reading = "uniquac", Reading.ALL_CONTACTS

    def worst(a: Audit) -> float:
        return next(
            v.deviation for v in a.verdicts
            if (v.model.name, v.reading, v.test.claim) == (name, reading, Claim.BOLTZMANN)
        )  # fmt: skip

    assert worst(given) > worst(audit)


def test_the_ranking_says_what_to_split_off(small: tuple[Audit, dict[str, Findings], Study]) -> None:
    audit, _, _ = small
    ranked = standings(audit)
    failures = [s.counts[Outcome.FAILS] for s in ranked]
    assert failures == sorted(failures)
    surface = next(s for s in ranked if s.model.name == "random-surface")
    assert surface.costliest is not None
    assert surface.split is not None
    assert surface.split.keep == "size ratio <= 1"
    assert "athermal" in surface.split.gained
    assert surface.split.kept == pytest.approx(0.5)


def test_companions_are_the_other_closures_or_the_next_best() -> None:
    assert companions_of(("rhnc",)) == ("hnc",)
    assert companions_of(("py",)) == ("rhnc",)
    assert companions_of(("rhnc", "py", "msa")) == ("py", "msa")


# --- files and the command ---------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("table", "words"),
    [
        ('[audit]\nmodels = ["wilsn"]', ["models", "wilsn", "wilson"]),
        ("[audit]\nz = 1", ["z", "1", "measured"]),
        ('[audit]\nz = "guess"', ["z", "guess", "measured"]),
        ("[audit.tolerances]\ncomposition = -1", ["audit.tolerances", "composition", "-1"]),
        ("[audit.tolerances]\ncompositon = 0.1", ["compositon", "composition"]),
        ("[audit]\nmodel = 1", ["model", "models"]),
    ],
)
def test_mistakes_in_the_audit_table(table: str, words: list[str], write: Callable[..., Path]) -> None:
    path = write(study_text() + table + "\n", "study.toml")
    with pytest.raises(BadInput) as error:
        read_study(path)
    assert all(word in str(error.value) for word in words)


def test_tolerances_of_the_study_decide(write: Callable[..., Path], tmp_path: Path) -> None:
    strict = read_study(write(study_text() + "[audit.tolerances]\ndensity = 1e-6\n", "strict.toml"))
    loose = read_study(write(study_text() + "[audit]\nmodels = ['wilson']\n", "loose.toml"))
    assert strict.keys() == loose.keys(), "how a class is judged does not change what is solved"
    audit, findings = audited(strict, tmp_path)
    wilson = [v for v in audit.verdicts if v.model.name == "wilson" and v.test.claim is Claim.DENSITY_FREE]
    assert {v.outcome for v in wilson} == {Outcome.FAILS}
    assert {v.tolerance for v in wilson} == {1e-6}
    again = run_audit(findings["rhnc"], loose.audit)
    assert {v.model.name for v in again.verdicts} == {"wilson"}
    assert {v.outcome for v in again.verdicts if v.test.claim is Claim.DENSITY_FREE} == {Outcome.HOLDS}


FIGURES = ("verdicts", "boltzmann", "ratios", "reciprocity", "multiplicity")


def test_the_command_writes_all_and_prints_json(
    run: Callable[..., object], write: Callable[..., Path], tmp_path: Path
) -> None:
    path, out = write(study_text(), "study.toml"), tmp_path / "out"
    ran = run("audit", path, "--out", out, "--models", "wilson,uniquac", "--json", "--workers", 1)
    assert ran.status == 0, ran.err  # type: ignore[attr-defined]
    body = json.loads(ran.out)  # type: ignore[attr-defined]
    assert (body["states"], body["failed_states"]) == (48, 0)
    assert {(v["model"], v["reading"]) for v in body["verdicts"]} == {
        (m, r) for m in ("Wilson", "UNIQUAC") for r in ("m = 1", "m = z/2")
    }
    for verdict in body["verdicts"]:
        assert set(verdict) >= {
            "model",
            "reading",
            "claim",
            "verdict",
            "measured",
            "claimed",
            "tolerance",
            "worst_state",
        }
        assert verdict["verdict"] in {"holds", "strained", "fails", "undecided"}
    assert json.loads((out / "verdicts.json").read_text(encoding="utf-8")) == body
    for name in FIGURES:
        assert (out / f"{name}.png").read_bytes().startswith(b"\x89PNG")
        assert "<svg" in (out / f"{name}.svg").read_text(encoding="utf-8")
    claims = list(csv.DictReader(io.StringIO((out / "claims.csv").read_text(encoding="utf-8"))))
    assert len(claims) == len(body["verdicts"])
    assert [c["verdict"] for c in claims] == [v["verdict"] for v in body["verdicts"]]
    rows = list(csv.DictReader(io.StringIO((out / "neighbors.csv").read_text(encoding="utf-8"))))
    assert len(rows) == 48 * 4
    row = next(r for r in rows if (r["center"], r["neighbor"], r["energy_ratio"]) == ("1", "2", "1.6"))
    expected = np.log(float(row["neighbor_ratio"]) / float(row["neighbor_ratio_athermal"]))
    assert float(row["multiplicity"]) == pytest.approx(expected / float(row["reduced_exchange_energy"]), rel=1e-9)
    assert float(row["stated ratio: Wilson, m = 1"]) == pytest.approx(np.exp(float(row["reduced_exchange_energy"])))


@pytest.mark.parametrize("text", [STATE, TERNARY], ids=["binary", "ternary"])
def test_a_single_state_is_judged_in_a_small_class(
    text: str, run: Callable[..., object], write: Callable[..., Path], tmp_path: Path
) -> None:
    path, out = write(text), tmp_path / "out"
    study = study_of_state(read_state(path))
    request = read_state(path)
    own = [c for c in study.cases if np.allclose(c.state.mole_fractions, request.state.mole_fractions)]
    assert any(
        c.state.temperature == request.state.temperature
        and c.mixture.packing_fraction(c.state) == pytest.approx(request.mixture.packing_fraction(request.state))
        for c in own
    )
    ran = run("audit", path, "--out", out, "--workers", 1)
    assert ran.status == 0, ran.err  # type: ignore[attr-defined]
    assert "Verdicts by claim" in ran.out  # type: ignore[attr-defined]
    assert "tolerance" in ran.out  # type: ignore[attr-defined]
    assert "practice decide" in ran.out.replace("\n", " ")  # type: ignore[attr-defined]


def test_wrong_models_are_named(run: Callable[..., object], write: Callable[..., Path], tmp_path: Path) -> None:
    ran = run("audit", write(study_text(), "study.toml"), "--out", tmp_path / "out", "--models", "wilson,uniqac")
    assert ran.status == 2  # type: ignore[attr-defined]
    assert "--models" in ran.err and "uniqac" in ran.err and "uniquac" in ran.err  # type: ignore[attr-defined]  # noqa: PT018


def test_every_claim_says_why_its_tolerance_is_what_it_is() -> None:
    assert [test.claim.value for test in CLAIMS] == list(range(1, 11))
    assert all(len(test.why) > 20 and test.tolerance > 0.0 for test in CLAIMS)
