"""Each model's statements about neighbours held against what was found: verdicts by rules fixed beforehand."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from enum import StrEnum
from typing import Any

import numpy as np
from numpy.typing import NDArray

from localcomp.auditsettings import AuditSettings
from localcomp.claims import CLAIMS, ClaimTest, Items
from localcomp.evidence import Array, Findings, Table, planted
from localcomp.models import LATTICE_COORDINATION, ActivityModel, Claim, Reading

STRAINED = 3.0
"""In tolerances: up to here a claim is strained, beyond it fails."""


class Outcome(StrEnum):
    """What became of a claim over the class."""

    HOLDS = "holds"
    STRAINED = "strained"
    FAILS = "fails"
    UNDECIDED = "undecided"


@dataclass(frozen=True)
class Verdict:
    """One claim of one model under one reading.

    Attributes
    ----------
    model : ActivityModel
    reading : Reading
    test : ClaimTest
    outcome : Outcome
    reason : str
        In words.
    measured, claimed : float
        At the worst state; NaN when nothing could be tested.
    tolerance, deviation, uncertainty : float
        Largest difference allowed; found at the worst state; numerical plus closure uncertainty there.
    spread : tuple of float
        Smallest, largest and root mean square difference over the class.
    worst_state : dict
        The state, and the pair, where the difference is largest.
    items : Items
        The measured numbers.
    difference, uncertainties : ndarray, shape (k,)
        Of every item; NaN where there is none.
    """

    model: ActivityModel
    reading: Reading
    test: ClaimTest
    outcome: Outcome
    reason: str
    measured: float
    claimed: float
    tolerance: float
    deviation: float
    uncertainty: float
    spread: tuple[float, float, float]
    worst_state: dict[str, Any]
    items: Items
    difference: Array
    uncertainties: Array


@dataclass(frozen=True)
class Audit:
    """The verdicts over a class and what they rest on.

    Attributes
    ----------
    closure : str
    companions : tuple of str
        Closures the uncertainty was read from.
    z : float
        Lattice coordination number used.
    z_measured : float
        Mean number of neighbours over the class.
    settings : AuditSettings
    findings : Findings
    verdicts : tuple of Verdict
    names : tuple of str
        Species, for pairs in text, where the states have no names of their own.
    temperature_unit : str
        " K", or nothing for kT in the energy unit.
    """

    closure: str
    companions: tuple[str, ...]
    z: float
    z_measured: float
    settings: AuditSettings
    findings: Findings
    verdicts: tuple[Verdict, ...]
    names: tuple[str, ...]
    temperature_unit: str = ""

    @property
    def states(self) -> int:
        """States of the study."""
        return len(self.findings.main.temperature)

    @property
    def failed_states(self) -> int:
        """States without a physical solution."""
        return int(self.states - self.findings.main.solved.sum())

    def species(self, row: int) -> tuple[str, ...]:
        """Names of the species of one state of the study."""
        return self.findings.main.species(row, self.names)

    def of(self, model: ActivityModel, reading: Reading) -> list[Verdict]:
        """All verdicts of one model under one reading."""
        return [v for v in self.verdicts if v.model == model and v.reading is reading]

    def rows(self) -> list[tuple[ActivityModel, Reading]]:
        """Models and readings in order."""
        return list(dict.fromkeys((v.model, v.reading) for v in self.verdicts))


def run_audit(
    findings: Findings, settings: AuditSettings, closure: str = "", companions: dict[str, Findings] | None = None,
    names: tuple[str, ...] = ("1", "2"),
) -> Audit:  # fmt: skip
    """Judge every claim of every model.

    Parameters
    ----------
    findings : Findings
        Of the closure that is judged by.
    companions : dict of Findings
        The same states under other closures.
    """
    others = companions or {}
    z_measured = mean_coordination(findings.main)
    z = settings.z if settings.z is not None else z_measured
    if not np.isfinite(z):  # nothing was solved, so nothing will be judged
        z = LATTICE_COORDINATION
    measured = {test.claim: test.measure(findings) for test in CLAIMS}
    spread = {test.claim: _closure_spread(test, measured[test.claim], list(others.values())) for test in CLAIMS}
    verdicts = []
    for model in settings.models:
        for reading in model.readings:
            stated = planted(findings, model, reading, z)
            for test in CLAIMS:
                if test.claim not in model.claims:
                    continue
                claimed = test.measure(stated).values
                found = measured[test.claim]
                doubt = found.error + spread[test.claim]
                table = findings.ternary if test.on_ternaries else findings.main
                verdicts.append(
                    _verdict(model, reading, test, settings.tolerance(test.key), found, claimed, doubt, table, names)
                )
    return Audit(closure, tuple(others), z, z_measured, settings, findings, tuple(verdicts), names)


def mean_coordination(table: Table) -> float:
    """Mean number of neighbours of a molecule over the solved states: z as measured."""
    x = table.mole_fractions
    per_state = (x[:, :, None] * x[:, None, :] * table.counts).sum(axis=(1, 2))
    per_state = per_state[np.isfinite(per_state)]
    return float(per_state.mean()) if per_state.size else float("nan")


def _closure_spread(test: ClaimTest, found: Items, others: Sequence[Findings]) -> Array:
    """How much the measured numbers move between closures; where no other has an answer, the worst of the class."""
    if not others:
        return np.zeros_like(found.values)
    gaps = np.abs(np.array([test.measure(other).values - found.values for other in others]))
    known = np.isfinite(gaps)
    worst = float(gaps[known].max()) if known.any() else 0.0
    return np.where(known.any(axis=0), np.max(np.where(known, gaps, -1.0), axis=0, initial=-1.0), worst)


def _category(value: float, tolerance: float) -> Outcome:
    if value <= tolerance:
        return Outcome.HOLDS
    return Outcome.STRAINED if value <= STRAINED * tolerance else Outcome.FAILS


def decide(difference: Array, doubt: Array, tolerance: float) -> Outcome:
    """The verdict on absolute differences and their uncertainties, both of shape (k,).

    The worst difference decides; if taking the uncertainties off and putting them on lead to different
    verdicts, it is undecided.
    """
    low = float(np.max(difference - doubt))
    high = float(np.max(difference + doubt))
    lower, upper = _category(low, tolerance), _category(high, tolerance)
    return lower if lower is upper else Outcome.UNDECIDED


def _verdict(
    model: ActivityModel, reading: Reading, test: ClaimTest, tolerance: float, found: Items, claimed: Array,
    doubt: Array, table: Table | None, names: tuple[str, ...],
) -> Verdict:  # fmt: skip
    with np.errstate(invalid="ignore"):
        signed = found.values - claimed
    usable = np.isfinite(signed) & np.isfinite(doubt)  # without a known uncertainty nothing is decided
    nan = float("nan")
    if table is None or not usable.any():
        tested = bool((np.isfinite(found.values) & np.isfinite(doubt)).any())
        reason = "the model states nothing for energies this large" if tested else test.missing
        if table is not None and not table.solved.any():
            reason = "no state has a solution"
        return Verdict(
            model, reading, test, Outcome.UNDECIDED, f"not tested: {reason}", nan, nan, tolerance, nan, nan,
            (nan, nan, nan), {}, found, np.full_like(found.values, nan), doubt,
        )  # fmt: skip
    size = np.where(usable, np.abs(signed), nan)
    outcome = decide(size[usable], doubt[usable], tolerance)
    worst = int(np.nanargmax(size))
    spread = (float(np.nanmin(signed)), float(np.nanmax(signed)), float(np.sqrt(np.nanmean(size**2))))
    return Verdict(
        model, reading, test, outcome, _reason(outcome, float(size[worst]), float(doubt[worst]), tolerance),
        float(found.values[worst]), float(claimed[worst]), tolerance, float(size[worst]), float(doubt[worst]), spread,
        describe_state(table, found, worst, names), found, size, doubt,
    )  # fmt: skip


def _reason(outcome: Outcome, size: float, doubt: float, tolerance: float) -> str:
    margin = f"off by up to {size:.3g} (tolerance {tolerance:g}, uncertainty there {doubt:.2g})"
    if outcome is Outcome.UNDECIDED:
        return f"{margin}: the uncertainty is wider than the margin"
    return margin


def describe_state(table: Table, items: Items, number: int, names: tuple[str, ...]) -> dict[str, Any]:
    """Where one item was measured: labels, conditions and pair."""
    row = int(items.row[number])
    state: dict[str, Any] = dict(table.labels[row])
    state["mole_fractions"] = [float(x) for x in table.mole_fractions[row]]
    state["temperature"] = float(table.temperature[row])
    state["packing_fraction"] = float(table.packing[row])
    center, neighbor = int(items.center[number]), int(items.neighbor[number])
    if center >= 0:
        known = table.species(row, names)
        state["center"] = known[center]
        if neighbor != center:
            state["neighbor"] = known[neighbor]
    return state


def multiplicity(findings: Findings) -> Array:
    """m_ij = [ln R_ij - ln R_ij(athermal)]/D_ij, shape (n, s, s): the exponent a pair really obeys.

    NaN where the energies do not differ (D_ij = 0).
    """
    table = findings.main
    change = table.ln_ratio - _athermal_ln(findings)
    own = np.diagonal(table.depth, axis1=1, axis2=2)
    exchange = (table.depth - own[:, :, None]) / table.temperature[:, None, None]
    tiny = np.abs(exchange) < 1e-9
    return np.asarray(np.where(tiny, np.nan, change / np.where(tiny, 1.0, exchange)))


def _athermal_ln(findings: Findings) -> Array:
    from localcomp.evidence import log_ratio

    return log_ratio(findings.athermal)


def main_rows(verdict: Verdict) -> NDArray[np.int_]:
    """State number of every item; -1 for those measured on ternaries."""
    if verdict.test.claim is Claim.TERNARY:
        return np.full_like(verdict.items.row, -1)
    return verdict.items.row
