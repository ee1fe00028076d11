"""Tables behind the figures of fits."""

from __future__ import annotations

import numpy as np

from localcomp.figures.fits import Cloud, FitPanel
from localcomp.fit import fitted_ln_gamma, true_values
from localcomp.fitpair import PairResult, unfitted
from localcomp.fitstudy import FitReport
from localcomp.fittables import by_model
from localcomp.models import Adjustable, Reading

FINE = 101


def shown_pair(report: FitReport) -> PairResult | None:
    """The pair that figures show: the one with the largest |ln gamma| that some model fits well, or the largest."""
    good = [pair for pair in report.pairs if not pair.reason]
    if not good:
        return None
    fitted = [pair for pair in good if min(t.regression.rms for t in pair.tests) < 0.02]
    return max(fitted or good, key=lambda pair: float(np.nanmax(np.abs(pair.ln_gamma))))


def fit_panels(pair: PairResult) -> list[FitPanel]:
    """Every model on one pair at its lowest temperature."""
    task = pair.task
    cold = min(task.temperatures)
    here = pair.temperature == cold
    fine = np.linspace(0.0, 1.0, FINE)
    rows, warmth = np.column_stack([fine, 1.0 - fine]), np.full(FINE, cold)
    out = []
    for test in pair.tests:
        model = test.regression.model
        raw = [(r.label(), unfitted(model, r, task.mixture, warmth, rows, task.z)) for r in Reading]
        out.append(
            FitPanel(
                f"{model.label}\nrms {test.regression.rms:.3f}",
                pair.x[here],
                pair.ln_gamma[here],
                fine,
                fitted_ln_gamma(model, task.mixture, test.energies, warmth, rows, task.z),
                raw,
            )
        )
    return out


def pair_heading(pair: PairResult, unit: str) -> str:
    """A pair in words."""
    labels = pair.task.labels
    words = {"size_ratio": "σ_2/σ_1", "energy_ratio": "ε_2/ε_1", "well_range": "λ", "mixture": ""}
    parts = []
    for name, value in labels.items():
        if name in ("l", "mixture_number") and value in (0.0, 1):
            continue
        shown = f"{value:g}" if isinstance(value, float | int) else str(value)
        label = words.get(name, name)
        parts.append(f"{label} = {shown}" if label else shown)
    cold = min(pair.task.temperatures)
    return f"{', '.join(parts)}, T = {cold:.5g}{unit}, η = {pair.task.packing_fraction:.3g}"


def ratio_clouds(report: FitReport) -> list[Cloud]:
    """True and implied ratios of every model over the study."""
    out = []
    for n, (model, _) in enumerate(by_model(report).items()):
        pairs = [pair for pair in report.pairs if not pair.reason]
        true = np.concatenate([pair.ratios.ravel() for pair in pairs])
        implied = np.concatenate([pair.tests[n].implied.ravel() for pair in pairs])
        good = np.isfinite(true) & np.isfinite(implied)
        out.append(Cloud(model.label, true[good], implied[good]))
    return out


def energy_clouds(report: FitReport) -> list[Cloud]:
    """True and fitted energies of every model: exchange or interchange ones (made of a lone unlike energy)."""
    out = []
    for n, (model, _) in enumerate(by_model(report).items()):
        pairs = [pair for pair in report.pairs if not pair.reason]
        true = np.concatenate([true_values(model, pair.task.mixture) for pair in pairs])
        fitted = np.concatenate([pair.tests[n].regression.values for pair in pairs])
        if model.adjustable is Adjustable.UNLIKE:
            like = np.array([np.diag(pair.task.mixture.pairs.well_depth).mean() for pair in pairs])
            true, fitted = true - like, fitted - like
        out.append(Cloud(model.label, true, fitted))
    return out
