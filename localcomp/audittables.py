"""What an audit writes: claims.csv, neighbors.csv, verdicts.json."""

from __future__ import annotations

import csv
import io
from typing import Any

import numpy as np

from localcomp.audit import Audit, Verdict, multiplicity
from localcomp.claims import CLAIMS
from localcomp.evidence import log_ratio
from localcomp.report import CAUTION, clean
from localcomp.standing import Standing, reading_text, sentences, title
from localcomp.study import Study

CLAIM_COLUMNS = (
    "model", "reading", "contacts_m", "claim", "claim_text", "quantity", "verdict", "measured_at_worst",
    "claimed_at_worst", "difference_at_worst", "uncertainty_at_worst", "tolerance", "tolerance_reason",
    "smallest_difference", "largest_difference", "rms_difference", "worst_state", "reason",
)  # fmt: skip


def claims_csv(audit: Audit) -> str:
    """One row per model, reading and claim (RFC 4180)."""
    buffer = io.StringIO()
    writer = csv.writer(buffer, lineterminator="\r\n")
    writer.writerow(CLAIM_COLUMNS)
    for v in audit.verdicts:
        low, high, rms = v.spread
        numbers = [v.measured, v.claimed, v.deviation, v.uncertainty]
        contacts = float(v.reading.contacts(audit.z)) if len(v.model.readings) > 1 else float("nan")
        writer.writerow(
            [v.model.label, reading_text(v.model, v.reading), _number(contacts), v.test.claim.value,
             v.test.sentence, v.test.quantity, v.outcome.value, *map(_number, numbers), _number(v.tolerance),
             v.test.why, _number(low), _number(high), _number(rms), state_text(v.worst_state), v.reason]
        )  # fmt: skip
    return buffer.getvalue()


def _number(value: float) -> str:
    return repr(float(value)) if np.isfinite(value) else ""


def state_text(state: dict[str, Any]) -> str:
    """A state in one line."""
    parts = []
    for name, value in state.items():
        if isinstance(value, list):
            parts.append(f"{name} = {' '.join(f'{x:.4g}' for x in value)}")
        else:
            parts.append(f"{name} = {value:.6g}" if isinstance(value, float) else f"{name} = {value}")
    return "; ".join(parts)


def neighbors_csv(audit: Audit, study: Study) -> str:
    """One row per state and pair: what was found, the measured multiplicity, and what every model states."""
    findings, table = audit.findings, audit.findings.main
    labels = list(dict.fromkeys(name for label in table.labels for name in label))
    stated = {
        f"stated ratio: {title(model, reading)}": model.ratios(table.given(audit.z), reading)
        for model, reading in audit.rows()
    }
    buffer = io.StringIO()
    writer = csv.writer(buffer, lineterminator="\r\n")
    writer.writerow(
        [*labels, f"temperature ({study.units.temperature_label})", "packing_fraction", "mole_fractions", "center",
         "neighbor", "coordination_number", "local_mole_fraction", "neighbor_ratio", "neighbor_ratio_relative_error",
         "neighbor_ratio_athermal", "reduced_exchange_energy", "multiplicity", *stated]
    )  # fmt: skip
    x = table.mole_fractions
    numbers = table.counts * x[:, None, :]
    fractions = numbers / numbers.sum(axis=-1, keepdims=True)
    ratio, athermal = np.exp(table.ln_ratio), np.exp(log_ratio(findings.athermal))
    exchange = table.given(audit.z).exchange
    exponent = multiplicity(findings)
    error = table.ln_error
    size = x.shape[1]
    for n, label in enumerate(table.labels):
        names = audit.species(n)
        for i in range(size):
            for j in range(size):
                found = [numbers, fractions, ratio, error, athermal, exchange, exponent, *stated.values()]
                writer.writerow(
                    [*(label.get(name, "") for name in labels), repr(float(table.temperature[n])),
                     repr(float(table.packing[n])), " ".join(repr(float(v)) for v in x[n]), names[i],
                     names[j], *(_number(values[n, i, j]) for values in found)]
                )  # fmt: skip
    return buffer.getvalue()


def verdict_body(v: Verdict) -> dict[str, Any]:
    """One verdict as plain values."""
    return {
        "model": v.model.label,
        "reading": reading_text(v.model, v.reading),
        "claim": v.test.claim.value,
        "claim_text": v.test.sentence,
        "quantity": v.test.quantity,
        "verdict": v.outcome.value,
        "measured": v.measured,
        "claimed": v.claimed,
        "difference": v.deviation,
        "uncertainty": v.uncertainty,
        "tolerance": v.tolerance,
        "spread": {"smallest": v.spread[0], "largest": v.spread[1], "rms": v.spread[2]},
        "worst_state": v.worst_state,
        "reason": v.reason,
    }


def _ternaries(audit: Audit) -> list[dict[str, Any]]:
    """Mixtures of three and more that claim 8 was tested on, with their conditions, each once."""
    table = audit.findings.ternary
    if table is None:
        return []
    found = {}
    for n, labels in enumerate(table.labels):
        entry = {**labels, "temperature": float(table.temperature[n]), "packing_fraction": float(table.packing[n])}
        found[state_text(entry)] = entry
    return list(found.values())


def verdicts_json(audit: Audit, ranked: list[Standing], study: Study) -> dict[str, Any]:
    """The whole audit as plain values."""
    body = {
        "verdicts": [verdict_body(v) for v in audit.verdicts],
        "states": audit.states,
        "failed_states": audit.failed_states,
        "closure": audit.closure,
        "uncertainty_from_closures": list(audit.companions),
        "z": audit.z,
        "z_measured": audit.z_measured,
        "shell_rule": study.rule.description,
        "accuracy": study.accuracy,
        "ternaries": _ternaries(audit),
        "tolerances": {
            test.key: {"value": audit.settings.tolerance(test.key), "default": test.tolerance, "why": test.why}
            for test in CLAIMS
        },
        "ranking": [
            {
                "model": s.model.label,
                "reading": reading_text(s.model, s.reading),
                "survives": s.survives,
                **{outcome.value: count for outcome, count in s.counts.items()},
                "costliest_claim": None if s.costliest is None else s.costliest.test.claim.value,
                "cost_in_tolerances": s.cost,
                "split": None
                if s.split is None
                else {"keep": s.split.keep, "share_kept": s.split.kept, "claims_gained": list(s.split.gained)},
            }
            for s in ranked
        ],
        "summary": sentences(audit, ranked),
        "caution": CAUTION,
    }
    cleaned = clean(body)
    assert isinstance(cleaned, dict)
    return cleaned
