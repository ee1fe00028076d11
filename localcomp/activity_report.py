"""Everything `localcomp activity` says: the request from a state or study file, all closures, JSON."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np

from localcomp.activity import activity_at_packing
from localcomp.activity_parts import Activity, Array
from localcomp.activity_pressure import activity_at_pressure, energy_pressure
from localcomp.errors import NoAnswer
from localcomp.inputs import read_state
from localcomp.report import CAUTION, clean
from localcomp.stability import branch_ends, stability_criterion, unstable_ranges
from localcomp.study import read_study
from localcomp.tables import load_toml
from localcomp.units import AVOGADRO_A3_PER_CM3, GAS_CONSTANT, Units
from ozsolve import CLOSURES, Mixture, State

STEPS = 10
"""A binary is shown at steps of a tenth in mole fraction."""
MPA_PER_KELVIN_A3 = GAS_CONSTANT / AVOGADRO_A3_PER_CM3
"""k in MPa angstrom^3/K."""


@dataclass(frozen=True)
class IsothermRequest:
    """One mixture at one temperature.

    Attributes
    ----------
    mixture : Mixture
    units : Units
    temperature, packing_fraction : float
    composition : ndarray, shape (s,)
        Where the pressure is taken from; the solvent of infinite dilution when there are more than two species.
    mole_fractions : ndarray, shape (m, s)
        What is listed.
    closure : str
    others : tuple of str
        Closures held beside it.
    accuracy : float
    basis : {"packing", "pressure"}
    pressure : float or None
        Energy unit over cubed length unit; None: that of `composition` at `packing_fraction`.
    """

    mixture: Mixture
    units: Units
    temperature: float
    packing_fraction: float
    composition: Array
    mole_fractions: Array
    closure: str
    others: tuple[str, ...]
    accuracy: float
    basis: str
    pressure: float | None

    @property
    def state(self) -> State:
        """The state the pressure is taken from."""
        return State(self.temperature, tuple(self.composition), packing_fraction=self.packing_fraction)


@dataclass(frozen=True)
class IsothermReport:
    """One isotherm: listed compositions first, then one row per species at infinite dilution.

    Attributes
    ----------
    request : IsothermRequest
    found : Activity or None
        None when nothing is available; `reason` then says why.
    others : dict
        Closure to its Activity, or to the reason why it has none.
    gaps : list of (float, float)
        Ranges of x1 where the closure has no solution.
    """

    request: IsothermRequest
    found: Activity | None
    reason: str = ""
    others: dict[str, Activity | str] = field(default_factory=dict)
    gaps: list[tuple[float, float]] = field(default_factory=list)

    @property
    def listed(self) -> int:
        """Number of listed compositions."""
        return len(self.request.mole_fractions)

    def split(self, rows: Array) -> tuple[Array, Array]:
        """(at listed compositions, at infinite dilution of each species) from an array (m + s, s)."""
        return rows[: self.listed], np.diag(rows[self.listed :]).copy()

    def closure_gap(self) -> Array:
        """Largest distance of another closure's ln gamma, shape (m + s, s); NaN where there is none."""
        assert self.found is not None
        rows = [other.ln_gamma for other in self.others.values() if isinstance(other, Activity)]
        if not rows:
            return np.full_like(self.found.ln_gamma, math.nan)
        distance = np.abs(np.array(rows) - self.found.ln_gamma)
        missing = np.isnan(distance).all(axis=0)
        return np.where(missing, math.nan, np.where(np.isnan(distance), -1.0, distance).max(axis=0))

    @property
    def splitting(self) -> dict[str, list[tuple[float, float]]]:
        """Ranges of x1 where two liquids form: by ln gamma of the energy route, by S_cc(0), without solution."""
        out = {"energy_route": [], "kirkwood_buff": [], "no_solution": self.gaps}
        if self.found is not None and self.found.curve is not None:
            curve = self.found.curve
            first = curve.mole_fractions[:, 0]
            out["energy_route"] = unstable_ranges(first, stability_criterion(first, curve.ln_gamma))
            out["kirkwood_buff"] = unstable_ranges(first, curve.inverse_scc)
        return out

    @property
    def warnings(self) -> tuple[str, ...]:
        """Sentences a reader should see beside the numbers."""
        notes = []
        name = self.request.mixture.names[0]
        words = {
            "energy_route": "ln gamma (energy route) splits the liquid",
            "kirkwood_buff": "concentration fluctuations of the closure are unstable",
            "no_solution": "the closure has no solution (its spinodal)",
        }
        for key, ranges in self.splitting.items():
            notes += [f"{words[key]} for x({name}) from {low:.3f} to {high:.3f}" for low, high in ranges]
        if self.found is not None:
            notes += [
                f"x = ({', '.join(f'{v:.4g}' for v in row)}): not available, {reason}"
                for row, reason in zip(self.found.mole_fractions, self.found.reasons, strict=True)
                if reason
            ]
        notes += [f"{name}: {other}" for name, other in self.others.items() if isinstance(other, str)]
        return tuple(notes)


def read_requests(
    path: Path, closure: str | None, accuracy: float | None, basis: str, pressure: float | None, compare: bool
) -> list[IsothermRequest]:
    """Isotherms of a state file (one) or a study (one per mixture, temperature and packing fraction).

    Parameters
    ----------
    pressure : float or None
        MPa when the file is in kelvin and angstrom, reduced otherwise.

    Raises
    ------
    BadInput
        With every mistake of the file.
    """
    if "conditions" not in load_toml(path):
        file = read_state(path)
        x = np.array(file.state.mole_fractions)
        eta = file.mixture.packing_fraction(file.state)
        chosen = closure or file.closure
        return [
            IsothermRequest(
                file.mixture, file.units, file.state.temperature, eta, x, _listed(x), chosen, _others(chosen, compare),
                accuracy or file.accuracy, basis, _pressure_in(pressure, file.units),
            )
        ]  # fmt: skip
    study = read_study(path)
    groups: dict[tuple[int, float, float], tuple[Mixture, list[tuple[float, ...]]]] = {}
    for case in study.cases:
        if case.closure == study.closures[0]:
            packing = case.state.packing_fraction
            assert packing is not None
            key = (id(case.mixture), case.state.temperature, packing)
            groups.setdefault(key, (case.mixture, []))[1].append(case.state.mole_fractions)
    chosen = closure or study.closures[0]
    others = _others(chosen, compare)
    return [
        IsothermRequest(
            mixture, study.units, temperature, eta, np.full(mixture.species, 1.0 / mixture.species), np.array(rows),
            chosen, others, accuracy or study.accuracy, basis, _pressure_in(pressure, study.units),
        )
        for (_, temperature, eta), (mixture, rows) in groups.items()
    ]  # fmt: skip


def _others(chosen: str, compare: bool) -> tuple[str, ...]:
    return tuple(name for name in CLOSURES if name != chosen) if compare else ()


def _listed(x: Array) -> Array:
    """Tenths for two species, and the file's own composition."""
    if len(x) != 2:
        return x[None]
    first = np.unique(np.append(np.arange(STEPS + 1) / STEPS, x[0]))
    return np.stack((first, 1.0 - first), axis=1)


def _pressure_in(pressure: float | None, units: Units) -> float | None:
    return pressure / MPA_PER_KELVIN_A3 if pressure is not None and absolute(units) else pressure


def absolute(units: Units) -> bool:
    """Whether pressures are in MPa and volumes in cm3/mol."""
    return units.real and units.length == "angstrom"


def infinite_rows(composition: Array) -> Array:
    """Row i: species i taken out of the composition, the others in proportion; shape (s, s)."""
    size = len(composition)
    rows = np.tile(composition, (size, 1))
    np.fill_diagonal(rows, 0.0)
    empty = rows.sum(axis=1) <= 0.0
    rows[empty] = 1.0 - np.eye(size)[empty]
    return np.asarray(rows / rows.sum(axis=1, keepdims=True))


def report_isotherm(request: IsothermRequest) -> IsothermReport:
    """Work out one isotherm under its closure and the others."""
    rows = np.concatenate((request.mole_fractions, infinite_rows(request.composition)))
    try:
        found = _work_out(request, request.closure, rows)
    except NoAnswer as reason:
        return IsothermReport(request, None, str(reason))
    others: dict[str, Activity | str] = {}
    for name in request.others:
        try:
            others[name] = _work_out(request, name, rows)
        except NoAnswer as reason:
            others[name] = str(reason)
    return IsothermReport(request, found, "", others, _gaps(request, found))


def _work_out(request: IsothermRequest, closure: str, rows: Array) -> Activity:
    if request.basis == "packing":
        return activity_at_packing(
            request.mixture, request.temperature, request.packing_fraction, rows, closure=closure,
            accuracy=request.accuracy,
        )[0]  # fmt: skip
    pressure = request.pressure
    if pressure is None:
        pressure = energy_pressure(request.mixture, request.state, request.closure, request.accuracy)
    return activity_at_pressure(
        request.mixture, request.temperature, pressure, rows, start=request.packing_fraction, closure=closure,
        accuracy=request.accuracy,
    )  # fmt: skip


def _gaps(request: IsothermRequest, found: Activity) -> list[tuple[float, float]]:
    if request.mixture.species != 2 or found.available.all() or request.basis != "packing":
        return []
    first = np.array([row[0] for row in found.mole_fractions])
    order = np.unique(first, return_index=True)[1]
    good = np.array([math.isfinite(value) for value in found.inverse_scc])
    return branch_ends(
        request.mixture, request.temperature, request.packing_fraction, first[order], good[order], request.closure,
        request.accuracy,
    )  # fmt: skip


def as_json(report: IsothermReport) -> dict[str, Any]:
    """The JSON object of one isotherm; numbers that do not exist are null."""
    request, found = report.request, report.found
    units = request.units
    body: dict[str, Any] = {
        "status": "available" if found is not None and found.available.all() else
        "partly_available" if found is not None and found.available.any() else "not_available",
        "message": report.reason,
        "basis": request.basis,
        "closure": request.closure,
        "names": list(request.mixture.names),
        "temperature": request.temperature,
        "packing_fraction": request.packing_fraction,
        "accuracy": request.accuracy,
        "x": request.mole_fractions,
        "units": {
            "energy": units.energy_label,
            "excess_volume": "cm3/mol" if absolute(units) else "cubed length unit per molecule",
            "pressure": "MPa" if absolute(units) else "energy unit per cubed length unit",
        },
    }  # fmt: skip
    if found is not None:
        body.update(_numbers(report, found))
    body["warnings"] = list(report.warnings)
    body["caution"] = CAUTION
    cleaned = clean(body)
    assert isinstance(cleaned, dict)
    return cleaned


def _numbers(report: IsothermReport, found: Activity) -> dict[str, Any]:
    request, units = report.request, report.request.units

    def both(rows: Array) -> dict[str, Array]:
        at, infinite = report.split(rows)
        return {"ln_gamma": at, "ln_gamma_infinite": infinite}

    def energy(values: Array) -> list[float]:
        return [units.energy_out(float(v) * request.temperature) for v in values[: report.listed]]

    volume = AVOGADRO_A3_PER_CM3 if absolute(units) else 1.0
    pressure = MPA_PER_KELVIN_A3 if absolute(units) else 1.0
    body: dict[str, Any] = {
        **both(found.ln_gamma),
        "parts": {
            name: both(getattr(found.parts, name)) for name in ("flory_huggins", "hard_sphere", "attraction")
        },
        "excess_free_energy": energy(found.excess_free_energy),
        "excess_energy": energy(found.excess_energy),
        "numerical_error": both(found.numerical_error),
        "kirkwood_buff": both(found.kirkwood_buff),
        "route_gap": both(found.route_gap),
        "closure_gap": both(report.closure_gap()),
        "closures": {
            name: both(other.ln_gamma) if isinstance(other, Activity) else {"message": other}
            for name, other in report.others.items()
        },
        "stability": {
            "inverse_concentration_structure_factor": found.inverse_scc[: report.listed],
            "splitting": report.splitting,
        },
    }  # fmt: skip
    if found.basis == "pressure" and found.pressure is not None:
        body["pressure"] = found.pressure * pressure
        body["packing_fractions"] = found.packing_fraction[: report.listed]
        body["excess_volume"] = found.excess_volume[: report.listed] * volume
        body["excess_enthalpy"] = energy(found.excess_enthalpy)
    return body


def study_json(reports: Sequence[IsothermReport]) -> dict[str, Any]:
    """The JSON object of a study: its isotherms in order."""
    return {"isotherms": [as_json(report) for report in reports]}
