"""From isotherm reports to what a figure of ln gamma shows."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from localcomp.activity_parts import Activity
from localcomp.activity_report import IsothermReport
from localcomp.figures.activity import PanelData, SpeciesSeries


def isotherm_panels(reports: Sequence[IsothermReport]) -> list[PanelData]:
    """A panel per isotherm that has numbers: two species against mole fraction, more as bars of the parts."""
    return [_panel(report, report.found) for report in reports if report.found is not None]


def _panel(report: IsothermReport, found: Activity) -> PanelData:
    request = report.request
    names = request.mixture.names
    symbol, unit = ("T", " K") if request.units.real else ("kT", "")
    where = f"packing fraction {request.packing_fraction:.4g}" if found.pressure is None else "constant pressure"
    title = f"{symbol} = {request.temperature:g}{unit}, {where}, {request.closure.upper()}"
    head = slice(0, report.listed)
    if len(names) != 2:
        parts = (found.parts.flory_huggins, found.parts.hard_sphere, found.parts.attraction, found.ln_gamma)
        rows = np.array([part[0] for part in parts])
        where = ", ".join(f"{v:.3g}" for v in found.mole_fractions[0])
        return PanelData(title + f"\nx = ({where})", names, (), rows)
    curve = found.curve
    series = []
    for i, name in enumerate(names):
        x = found.mole_fractions[head, 0]
        order = np.argsort(x)
        line_x = x[order] if curve is None else curve.mole_fractions[:, 0]
        line = found.ln_gamma[head, i][order] if curve is None else curve.ln_gamma[:, i]
        kb = found.kirkwood_buff[head, i][order] if curve is None else curve.kirkwood_buff[:, i]
        others = tuple(
            (closure, other.curve.mole_fractions[:, 0], other.curve.ln_gamma[:, i])
            for closure, other in report.others.items()
            if isinstance(other, Activity) and other.curve is not None
        )
        series.append(SpeciesSeries(name, x[order], found.ln_gamma[head, i][order], line_x, line, kb, others))
    return PanelData(title, names, tuple(series), None)
