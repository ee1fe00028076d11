"""The audit's own proof: fed with neighbours that a model made, it finds that model and no rival.

The neighbours come from formulas written out in `statements`, not from the models under test. Two models may make the
same neighbours in a class (UNIQUAC and LSG under one reading, Wilson with one contact and NRTL with alpha = 0.2 and
five): where a rival has no failing claim, its statements are shown to be the truth's in every state. One pair coincides
to within the tolerances only: the quasi-chemical theory and its own expansion. The class "mild" is there for the makers
alone: its rivals differ by less than the audit calls failing.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import pytest

from localcomp.audit import Outcome, run_audit
from localcomp.auditsettings import AuditSettings
from localcomp.evidence import Findings, planted
from localcomp.models import MODELS, ActivityModel, Claim, Reading
from tests.localcomp.skeleton import CLASSES, skeleton
from tests.localcomp.statements import noisy, written_out

Z = 10.0
TRUTHS = [(model, reading) for model in MODELS for reading in model.readings]
SEED = 20261201


def with_numbers(findings: Findings) -> bool:
    """Whether a model states neighbours in every state (the first-order expansion does not for strong energies)."""
    tables = [findings.main.counts, findings.athermal, findings.binary]
    return all(table is not None and bool(np.isfinite(table).all()) for table in tables)


def cases() -> Iterator[tuple[str, ActivityModel, Reading]]:
    for name in CLASSES:
        for model, reading in TRUTHS:
            if with_numbers(planted(skeleton(name), model, reading, Z)):
                yield name, model, reading


CASES = list(cases())
case = pytest.mark.parametrize(("name", "model", "reading"), CASES, ids=lambda v: getattr(v, "name", v))


def parts(name: str, model: ActivityModel, reading: Reading) -> list[np.ndarray]:
    """ln R without wells, and what the wells add, as a model states them."""
    given = skeleton(name).main.given(Z)
    with np.errstate(divide="ignore", invalid="ignore"):
        bare, full = (np.log(model.ratios(conditions, reading)) for conditions in (given.athermal(), given))
    return [bare, full - bare]


def largest_gap(name: str, one: tuple[ActivityModel, Reading], other: tuple[ActivityModel, Reading]) -> float:
    """Largest difference between two models' statements, of the athermal and of the thermal part of ln R."""
    gaps = [np.abs(a - b) for a, b in zip(parts(name, *one), parts(name, *other), strict=True)]
    return max(float(np.nanmax(gap, initial=0.0)) for gap in gaps)


@case
@pytest.mark.parametrize("noise", [0.0, 0.005])
def test_the_maker_is_found(name: str, model: ActivityModel, reading: Reading, noise: float) -> None:
    rng = np.random.default_rng(SEED)
    truth = written_out(skeleton(name), model, reading, Z)
    if noise:
        truth = noisy(truth, noise, rng)
    audit = run_audit(truth, AuditSettings())
    outcomes = {v.test.claim: v.outcome for v in audit.of(model, reading)}
    assert set(outcomes) == model.claims
    assert set(outcomes.values()) == {Outcome.HOLDS}, {c.name: o.value for c, o in outcomes.items()}
    if name == "mild":
        return
    for rival in TRUTHS:
        if rival == (model, reading) or any(v.outcome is Outcome.FAILS for v in audit.of(*rival)):
            continue
        gap = largest_gap(name, (model, reading), rival)
        orders = {model.name, rival[0].name} == {"quasi-chemical", "quasi-chemical-first-order"}
        assert gap < (0.1 if orders else 1e-9), f"{rival[0].label} escaped"


def test_known_coincidences() -> None:
    """UNIQUAC and LSG state the same neighbours under one reading; alpha = 0.2 with five contacts is one contact."""
    name = "unlike sizes and energies"
    one, every = Reading
    by_name = {m.name: m for m in MODELS}
    assert largest_gap(name, (by_name["uniquac"], one), (by_name["lsg"], one)) < 1e-12
    assert largest_gap(name, (by_name["nrtl-0.2"], every), (by_name["wilson"], one)) < 1e-12
    assert largest_gap(name, (by_name["quasi-chemical"], one), (by_name["wilson"], one)) > 0.15


def test_what_a_model_makes_is_what_its_paper_says() -> None:
    """`planted`, which the audit's claims come from, against the written-out formulas."""
    for name, model, reading in CASES:
        ours, theirs = planted(skeleton(name), model, reading, Z), written_out(skeleton(name), model, reading, Z)
        assert ours.binary is not None
        assert ours.ternary is not None
        assert theirs.ternary is not None
        for one, other in (
            (ours.main.counts, theirs.main.counts), (ours.athermal, theirs.athermal), (ours.binary, theirs.binary),
            (ours.ternary.counts, theirs.ternary.counts),
        ):  # fmt: skip
            assert one == pytest.approx(other, rel=1e-9, abs=1e-9), (name, model.name)


@pytest.mark.parametrize("name", [n for n in CLASSES if n != "mild"])
def test_a_shifted_truth_is_not_taken_for_the_maker(name: str) -> None:
    """The check can fail: counts of unlike neighbours 20 % too high are nobody's."""
    model, reading = next((m, r) for m, r in TRUTHS if m.name == "wilson" and r is Reading.ONE_CONTACT)
    truth = planted(skeleton(name), model, reading, Z)
    raised = truth.main.counts * (1.0 + 0.2 * (1.0 - np.eye(2)))
    wrong = Findings(
        type(truth.main)(**{**truth.main.__dict__, "counts": raised, "well_counts": raised}), truth.athermal,
        truth.rules, truth.ternary, truth.binary,
    )  # fmt: skip
    outcomes = {v.test.claim: v.outcome for v in run_audit(wrong, AuditSettings()).of(model, reading)}
    assert outcomes[Claim.BOLTZMANN] is Outcome.FAILS
    assert outcomes[Claim.PRODUCT] is Outcome.FAILS


def test_uncertainty_makes_a_verdict_undecided() -> None:
    """Between closures that disagree by more than the margin, nothing is decided."""
    model, reading = next((m, r) for m, r in TRUTHS if m.name == "wilson" and r is Reading.ONE_CONTACT)
    truth = planted(skeleton("mild"), model, reading, Z)
    shifted = truth.main.counts * (1.0 + 0.08 * (1.0 - np.eye(2)))
    other = Findings(
        type(truth.main)(**{**truth.main.__dict__, "counts": shifted}), truth.athermal, truth.rules, truth.ternary,
        truth.binary,
    )  # fmt: skip
    audit = run_audit(truth, AuditSettings(), "one", {"two": other})
    outcomes = {v.test.claim: v.outcome for v in audit.of(model, reading)}
    assert outcomes[Claim.BOLTZMANN] is Outcome.UNDECIDED
    assert outcomes[Claim.COMPOSITION_FREE] is Outcome.HOLDS
