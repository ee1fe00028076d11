"""What the verdicts come to: which statements survive, which claim costs most, which part of the class to split off."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from localcomp.audit import Audit, Outcome, Verdict, decide, main_rows
from localcomp.evidence import Array, Table
from localcomp.models import ActivityModel, Claim, Reading

AXES = {
    "size_ratio": "size ratio",
    "energy_ratio": "energy ratio",
    "k": "k",
    "l": "l",
    "well_range": "well range",
    "reduced_temperature": "T*",
    "packing_fraction": "packing fraction",
    "mole_fraction": "x_1",
}
LEAST_KEPT = 0.25
"""Share of the class that must remain when a part is split off."""


@dataclass(frozen=True)
class Split:
    """A part of the class without which more claims hold.

    Attributes
    ----------
    keep : str
        Condition on what remains.
    kept : float
        Share of the states.
    gained : tuple of str
        Claims that hold then and did not before.
    """

    keep: str
    kept: float
    gained: tuple[str, ...]


@dataclass(frozen=True)
class Standing:
    """One model under one reading over the class.

    Attributes
    ----------
    model : ActivityModel
    reading : Reading
    counts : dict
        Claims by outcome.
    survives : bool
        All that was tested holds.
    costliest : Verdict or None
        The claim furthest from holding, in tolerances; the shell rule's is the same for all models and left out.
    split : Split or None
    """

    model: ActivityModel
    reading: Reading
    counts: dict[Outcome, int]
    survives: bool
    costliest: Verdict | None
    split: Split | None

    @property
    def cost(self) -> float:
        """Worst difference in tolerances."""
        return self.costliest.deviation / self.costliest.tolerance if self.costliest else 0.0


def standings(audit: Audit) -> list[Standing]:
    """One per model and reading: fewest failures first, then fewest claims that do not hold, then smallest cost."""
    out = [_standing(audit, model, reading) for model, reading in audit.rows()]
    return sorted(out, key=lambda s: (s.counts[Outcome.FAILS], -s.counts[Outcome.HOLDS], s.cost))


def _standing(audit: Audit, model: ActivityModel, reading: Reading) -> Standing:
    verdicts = audit.of(model, reading)
    counts = {outcome: sum(v.outcome is outcome for v in verdicts) for outcome in Outcome}
    tested = [v for v in verdicts if np.isfinite(v.deviation)]
    own = [v for v in tested if v.test.claim is not Claim.SHELL_RULE]
    costliest = max(own, key=lambda v: v.deviation / v.tolerance, default=None)
    if costliest is not None and costliest.outcome is Outcome.HOLDS:
        costliest = None
    bad = sum(v.outcome is not Outcome.HOLDS for v in tested)
    split = _best_split(audit.findings.main, tested) if bad else None
    return Standing(model, reading, counts, bad == 0 and bool(tested), costliest, split)


def axis_values(table: Table) -> dict[str, Array]:
    """Values of every axis along which the class varies, shape (n,) each."""
    columns: dict[str, Array] = {}
    for name in AXES:
        if name == "packing_fraction":
            column = np.round(table.packing, 10)
        elif name == "mole_fraction":
            if table.mole_fractions.shape[1] != 2:
                continue
            column = table.mole_fractions[:, 0]
        else:
            found = [label.get(name) for label in table.labels]
            if any(not isinstance(v, int | float) for v in found):
                continue
            column = np.array(found, float)
        if len(np.unique(column)) > 1:
            columns[name] = column
    return columns


def _best_split(table: Table, verdicts: list[Verdict], temperature_unit: str = "") -> Split | None:
    """The cut of one axis that makes most claims hold; of equals, the one that keeps most states."""
    best: tuple[int, float] = (0, 0.0)
    chosen: Split | None = None
    solved = table.solved
    for name, column in axis_values(table).items():
        levels = np.unique(column)
        called, unit = AXES[name], ""
        if name == "reduced_temperature" and np.allclose(column, table.temperature):
            called, unit = "T", temperature_unit  # not reduced by anything
        cuts = [(column <= v, f"{called} <= {v:.4g}{unit}") for v in levels[:-1]]
        cuts += [(column >= v, f"{called} >= {v:.4g}{unit}") for v in levels[1:]]
        for keep, text in cuts:
            kept = float(keep[solved].mean()) if solved.any() else 0.0
            if kept < LEAST_KEPT:
                continue
            gained = tuple(
                v.test.short for v in verdicts
                if v.outcome is not Outcome.HOLDS and _outcome_within(v, keep) is Outcome.HOLDS
            )  # fmt: skip
            if (len(gained), kept) > best and gained:
                best, chosen = (len(gained), kept), Split(text, kept, gained)
    return chosen


def _outcome_within(verdict: Verdict, keep: NDArray[np.bool_]) -> Outcome | None:
    """The verdict on part of the class; ranges are still measured from the middle of the whole."""
    rows = main_rows(verdict)
    inside = np.where(rows >= 0, keep[np.maximum(rows, 0)], True) & np.isfinite(verdict.difference)
    if not inside.any():
        return None
    return decide(verdict.difference[inside], verdict.uncertainties[inside], verdict.tolerance)


def sentences(audit: Audit, ranked: list[Standing]) -> list[str]:
    """The ranking in words."""
    out = []
    survivors = [s for s in ranked if s.survives]
    if survivors:
        names = "; ".join(title(s.model, s.reading) for s in survivors)
        out.append(f"Every tested statement survives for: {names}.")
    else:
        out.append("No model's statements all survive over this class.")
    if any(v.test.claim is Claim.SHELL_RULE and v.outcome is not Outcome.HOLDS for v in audit.verdicts):
        out.append("Whatever the model, the ratios hinge on the shell rule (claim 10).")
    for s in ranked:
        if s.costliest is not None:
            text = f"{title(s.model, s.reading)}: {cost_text(s)}"
            if s.split is not None:
                text += f"; {split_text(s)}"
            out.append(text + ".")
    return out


def cost_text(standing: Standing) -> str:
    """The claim that costs most."""
    v = standing.costliest
    return "" if v is None else f"{v.test.short} costs most ({v.deviation / v.tolerance:.1f} tolerances)"


def split_text(standing: Standing) -> str:
    """The part of the class in which more claims hold."""
    split = standing.split
    if split is None:
        return ""
    return f"within {split.keep} ({100 * split.kept:.0f} % of the class) these hold too: {', '.join(split.gained)}"


def reading_text(model: ActivityModel, reading: Reading) -> str:
    """The reading, or "either" where the statement does not depend on it."""
    return "either" if len(model.readings) == 1 else reading.label()


def title(model: ActivityModel, reading: Reading) -> str:
    """Model with its reading, where that matters."""
    return model.label if len(model.readings) == 1 else f"{model.label}, {reading.label()}"
