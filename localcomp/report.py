"""One solved state gathered for output: neighbours, statements, thermodynamics, caveats; JSON and CSV.

Everything a table or a figure of `localcomp state` shows is computed here; the command line only
formats it.
"""

from __future__ import annotations

import csv
import io
import math
import re
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from localcomp.energyroute import EnergyRoute, energy_route
from localcomp.errors import NoAnswer
from localcomp.inputs import StateFile
from localcomp.models import LATTICE_COORDINATION, TABLE_MODELS, ModelInput, Statement, compare
from localcomp.neighbors import Neighbors, ShellSensitivity, count_neighbors, shell_sensitivity
from localcomp.shells import FixedMultiple
from localcomp.units import AVOGADRO_A3_PER_CM3, GAS_CONSTANT
from ozsolve import CLOSURES, Solution, solve

Array = NDArray[np.float64]

NO_SHELL = "no_shell"
"""Status of a state that was solved but where the shell rule has no radius."""
CAUTION = (
    "Idealised spheres with square wells: no shape, no hydrogen bonds. Verify against measured phase equilibria "
    "before a model is chosen for a real separation; local codes and licensed practice decide."
)


@dataclass(frozen=True)
class StateReport:
    """Everything `localcomp state` says about one closure at one state.

    Attributes
    ----------
    request : StateFile
    solution : Solution
        Usable or failed; with a failed one the fields below are None.
    neighbors, sensitivity, statements, route :
        `route` is None with `route_reason` set when the energy route is not available.
    """

    request: StateFile
    solution: Solution
    neighbors: Neighbors | None = None
    sensitivity: ShellSensitivity | None = None
    statements: tuple[Statement, ...] = ()
    route: EnergyRoute | None = None
    route_reason: str = ""
    shell_reason: str = ""

    @property
    def usable(self) -> bool:
        """Whether there are numbers to show."""
        return self.neighbors is not None

    @property
    def status(self) -> str:
        """The word used in files."""
        return NO_SHELL if self.shell_reason else self.solution.status.value

    @property
    def message(self) -> str:
        """One sentence about the end."""
        if self.shell_reason or not self.request.units.real:
            return self.shell_reason or self.solution.message
        return re.sub(r"kT = ([-+.\deE]+\d)", r"T = \1 K", self.solution.message)

    @property
    def warnings(self) -> tuple[str, ...]:
        """Sentences a reader should see beside the numbers."""
        notes = list(self.solution.defects)
        if self.solution.status.value == "accuracy_not_reached":
            notes.append(self.solution.message)
        if self.sensitivity is not None:
            notes.extend(self.sensitivity.missing)
        if self.route is not None and self.route.z < 0.0:
            notes.append(
                "the energy route gives a negative pressure: at this density the liquid is under tension "
                "(a smaller volume would relax it)"
            )
        if self.route_reason:
            notes.append(f"no energy route: {self.route_reason}")
        return tuple(notes)


def report_state(request: StateFile) -> StateReport:
    """Solve one state and gather everything; a state without a physical solution gives a report too."""
    solution = solve(
        request.mixture, request.state, closure=request.closure, accuracy=request.accuracy, on_failure="return"
    )
    if not solution.status.usable:
        return StateReport(request, solution)
    try:
        neighbors = count_neighbors(solution, request.rule)
    except NoAnswer as reason:
        return StateReport(request, solution, shell_reason=str(reason))
    multiple = request.rule.multiple if isinstance(request.rule, FixedMultiple) else 1.5
    statements = compare(neighbors.neighbor_ratios, ModelInput.of(request.mixture, request.state), TABLE_MODELS)
    route: EnergyRoute | None = None
    reason_text = ""
    try:
        route = energy_route(request.mixture, request.state, request.closure, request.accuracy)
    except NoAnswer as reason:
        reason_text = str(reason)
    return StateReport(
        request, solution, neighbors, shell_sensitivity(solution, multiple), tuple(statements), route, reason_text
    )


def compare_closures(request: StateFile) -> list[StateReport]:
    """The same state under every closure."""
    return [report_state(replace(request, closure=name)) for name in CLOSURES]


def pressure_mpa(report: StateReport, z: float) -> float | None:
    """P = Z rho kT in MPa when the file is in kelvin and angstrom; None in reduced units."""
    units = report.request.units
    if units.length != "angstrom" or not units.real:
        return None
    rho_mol_m3 = float(report.solution.densities.sum()) / AVOGADRO_A3_PER_CM3 * 1e6
    return z * rho_mol_m3 * GAS_CONSTANT * report.request.state.temperature * 1e-6


def as_json(report: StateReport) -> dict[str, Any]:
    """The JSON object of one state; numbers that do not exist are null."""
    solution, request = report.solution, report.request
    units = request.units
    body: dict[str, Any] = {
        "status": report.status,
        "message": report.message,
        "closure": request.closure,
        "names": list(request.mixture.names),
        "temperature": request.state.temperature,
        "packing_fraction": request.mixture.packing_fraction(request.state),
        "mole_fractions": list(request.state.mole_fractions),
        "units": {
            "length": units.length,
            "energy": units.energy,
            "internal_energy": units.energy_label,
        },
        "branch_end_temperature": solution.branch_end_temperature,
        "accuracy": request.accuracy,
    }
    keys = (
        "coordination_numbers", "local_mole_fractions", "neighbor_ratios", "contact_values", "internal_energy",
        "compressibility_factor", "inverse_compressibility", "numerical_error",
    )  # fmt: skip
    body.update(_numbers(report) if report.usable else dict.fromkeys(keys))
    stats = solution.stats
    body["stats"] = {
        "steps": stats.steps,
        "transforms": stats.transforms,
        "grid_points": stats.grid_points,
        "spacing": stats.spacing * solution.length,
        "extent": stats.extent * solution.length,
        "rungs": len(stats.rungs),
        "seconds": stats.seconds,
    }
    body["warnings"] = list(report.warnings)
    body["caution"] = CAUTION
    cleaned = clean(body)
    assert isinstance(cleaned, dict)
    return cleaned


def _numbers(report: StateReport) -> dict[str, Any]:
    solution, found, units = report.solution, report.neighbors, report.request.units
    assert found is not None
    assert report.sensitivity is not None
    errors = solution.errors
    temperature = report.request.state.temperature
    inside, outside = solution.edge_values
    body: dict[str, Any] = {
        "shell": {"rule": found.rule.name, "radius": found.radius},
        "coordination_numbers": found.coordination_numbers,
        "local_mole_fractions": found.local_mole_fractions,
        "neighbor_ratios": found.neighbor_ratios,
        "contact_values": solution.contact_values,
        "edge_values": {"inside": inside, "outside": outside},
        "internal_energy": units.energy_out(solution.internal_energy),
        "compressibility_factor": {
            "virial": solution.virial_z,
            "energy": report.route.z if report.route else None,
        },
        "inverse_compressibility": solution.inverse_compressibility,
        "inverse_compressibility_virial": solution.virial_inverse_compressibility,
        "route_gap": {
            "inverse_compressibility": solution.route_gap,
            "compressibility_factor": solution.virial_z - report.route.z if report.route else None,
        },
        "kirkwood_buff": solution.kirkwood_buff,
        "concentration_structure_factor": solution.concentration_structure_factor,
        "lowest_eigenvalue": solution.lowest_eigenvalue,
        "numerical_error": {
            "coordination_numbers": found.coordination_errors,
            "local_mole_fractions": found.fraction_errors,
            "neighbor_ratios": found.ratio_errors,
            "contact_values": errors.contact,
            "internal_energy": units.energy_out(float(errors.energy) * temperature),
            "compressibility_factor": {"virial": errors.virial},
            "inverse_compressibility": errors.inverse_compressibility,
        },
        "shell_sensitivity": {
            "rules": [
                {"rule": r.rule.name, "radius": r.radius, "neighbor_ratios": r.neighbor_ratios}
                for r in report.sensitivity.results
            ],
            "spread": report.sensitivity.spread,
        },
        "statements": [
            {
                "model": s.model.label,
                "reading": s.reading.label(LATTICE_COORDINATION),
                "contacts": s.contacts,
                "neighbor_ratios": s.stated,
                "stated_over_found": s.off,
                "source": s.model.source,
            }
            for s in report.statements
        ],
    }
    pressure = pressure_mpa(report, solution.virial_z)
    if pressure is not None:
        body["pressure_mpa"] = {
            "virial": pressure,
            "energy": pressure_mpa(report, report.route.z) if report.route else None,
        }
    return body


def clean(value: Any) -> Any:
    """Arrays to lists, numbers that are not finite to None."""
    if isinstance(value, np.ndarray):
        return value.tolist() if np.isfinite(value).all() else clean(value.tolist())
    if isinstance(value, dict):
        return {key: clean(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [clean(item) for item in value]
    if isinstance(value, float | np.floating):
        return float(value) if math.isfinite(value) else None
    return value


def as_csv(reports: list[StateReport]) -> str:
    """One row per closure and pair, full precision; the first row names the columns."""
    buffer = io.StringIO()
    writer = csv.writer(buffer, lineterminator="\n")
    models = [
        f"{s.model.label}; {s.reading.label(LATTICE_COORDINATION)}" for r in reports if r.usable for s in r.statements
    ]
    labels = list(dict.fromkeys(models))
    columns = [
        "closure", "status", "center", "neighbor", "shell_radius", "coordination_number",
        "coordination_number_error", "local_mole_fraction", "local_mole_fraction_error", "neighbor_ratio",
        "neighbor_ratio_error", "contact_value", "contact_value_error", *(f"stated ratio: {name}" for name in labels),
    ]  # fmt: skip
    writer.writerow(columns)
    for report in reports:
        names = report.request.mixture.names
        head = [report.request.closure, report.status]
        found = report.neighbors
        for i, center in enumerate(names):
            for j, neighbor in enumerate(names):
                row: list[Any] = [*head, center, neighbor]
                if found is not None:
                    errors = report.solution.errors
                    tables = (
                        found.radius, found.coordination_numbers, found.coordination_errors,
                        found.local_mole_fractions, found.fraction_errors, found.neighbor_ratios, found.ratio_errors,
                        report.solution.contact_values, errors.contact,
                    )  # fmt: skip
                    row += [repr(float(table[i, j])) for table in tables]
                    row += [repr(float(s.stated[i, j])) for s in report.statements]
                writer.writerow(row + [""] * (len(columns) - len(row)))
    return buffer.getvalue()
