"""Square-well parameters of a pure liquid from its measured volume, energy and pressure.

At the given well range, two numbers are sought: the packing fraction eta (hence sigma, from the molar
volume) and the reduced temperature T* = kT/eps. Conditions: U_res/(RT) and Z = P V/(RT), the pressure
by the energy route (`energyroute`).
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from scipy.optimize import brentq

from localcomp.energyroute import energy_route
from localcomp.errors import BadInput, NoAnswer, Problem
from localcomp.inputs import not_this_kind, positive
from localcomp.tables import Table, load_toml
from localcomp.units import GAS_CONSTANT, density_from_molar_volume
from ozsolve import CLOSURES, Mixture, State, solve

KEYS = (
    "name", "temperature", "molar_volume", "residual_energy", "heat_of_vaporization", "pressure",
    "well_range", "closure", "source",
)  # fmt: skip
PACKING_RANGE = (0.15, 0.52)
"""Liquids lie well inside; below, the model's path in beta crosses its two-phase region."""
SCAN = 12
REDUCED_TEMPERATURE_RANGE = (0.35, 12.0)
ENERGY_TOLERANCE = 1e-9
PACKING_TOLERANCE = 1e-8


@dataclass(frozen=True)
class PureLiquid:
    """Measured numbers of a pure liquid at one temperature.

    Attributes
    ----------
    name, source : str
    temperature : float
        Kelvin.
    molar_volume : float
        cm3/mol.
    residual_energy : float
        U - U(ideal gas), J/mol, negative.
    pressure : float
        kPa.
    well_range : float
        lam, chosen.
    closure : str
    """

    name: str
    temperature: float
    molar_volume: float
    residual_energy: float
    pressure: float
    well_range: float = 1.5
    closure: str = "rhnc"
    source: str = "not given"

    @property
    def z(self) -> float:
        """P V/(RT), dimensionless."""
        return self.pressure * self.molar_volume * 1e-3 / (GAS_CONSTANT * self.temperature)

    @property
    def reduced_energy(self) -> float:
        """U_res/(RT)."""
        return self.residual_energy / (GAS_CONSTANT * self.temperature)


@dataclass(frozen=True)
class Calibration:
    """Parameters found and how well both conditions are met.

    Attributes
    ----------
    liquid : PureLiquid
    diameter : float
        sigma, angstrom.
    well_depth : float
        eps/k, kelvin.
    packing_fraction, reduced_temperature : float
        eta and T* = kT/eps of the calibrated fluid.
    residual_energy : float
        Reached, J/mol.
    pressure : float
        Reached by the energy route, kPa.
    virial_pressure : float
        By the virial route, kPa: what the closure says by its other route.
    """

    liquid: PureLiquid
    diameter: float
    well_depth: float
    packing_fraction: float
    reduced_temperature: float
    residual_energy: float
    pressure: float
    virial_pressure: float


def read_liquid(path: str | Path) -> PureLiquid:
    """Read and check a pure-liquid file ([fluid] table).

    Raises
    ------
    BadInput
        With every mistake found.
    """
    path = Path(path)
    content = load_toml(path)
    problems: list[Problem] = []
    top = Table(str(path), "", content, problems)
    not_this_kind(top, {"state": "a state file: localcomp state", "conditions": "a study: localcomp sweep"})
    top.known(("fluid",))
    if "fluid" not in content:
        top.missing("[fluid]", "a [fluid] table is needed")
        raise BadInput(problems)
    table = Table(str(path), "fluid", content["fluid"], problems)
    table.known(KEYS)
    name = table.text("name", "liquid")
    source = table.text("source", "not given")
    temperature = table.number("temperature", "a positive number, kelvin", positive)
    volume = table.number("molar_volume", "a positive number, cm3/mol", positive)
    pressure = table.number("pressure", "a number, kPa", math.isfinite)
    reach = table.number("well_range", "a number in (1, 2.5]", lambda v: 1.0 < v <= 2.5, default=1.5)
    closure = table.word("closure", CLOSURES, "rhnc")
    energy = _energy(table, temperature, volume, pressure)
    if problems or temperature is None or volume is None or pressure is None or reach is None or energy is None:
        raise BadInput(problems)
    return PureLiquid(name, temperature, volume, energy, pressure, reach, closure, source)


def _energy(table: Table, temperature: float | None, volume: float | None, pressure: float | None) -> float | None:
    """Residual energy, given or from the heat of vaporization: U_res = -(dH_vap - RT + P V_liquid),
    with the vapour taken as an ideal gas."""
    keys = [key for key in ("residual_energy", "heat_of_vaporization") if key in table.content]
    message = "give exactly one of residual_energy (negative) and heat_of_vaporization (positive), J/mol"
    if len(keys) != 1:
        if keys:
            table.complain(" and ".join(keys), [table.content[key] for key in keys], message)
        else:
            table.missing("residual_energy", message)
        return None
    if keys[0] == "residual_energy":
        return table.number("residual_energy", "a negative number, J/mol", lambda v: v < 0.0)
    heat = table.number("heat_of_vaporization", "a positive number, J/mol", positive)
    if heat is None or temperature is None or volume is None or pressure is None:
        return None
    energy = -(heat - GAS_CONSTANT * temperature + pressure * volume * 1e-3)
    if energy >= 0.0:
        table.complain("heat_of_vaporization", heat, "must exceed RT (the vapour is taken as an ideal gas)")
        return None
    return energy


def calibrate(liquid: PureLiquid, accuracy: float = 1e-5) -> Calibration:
    """Find sigma and eps such that the solved fluid has the liquid's energy and pressure.

    Raises
    ------
    NoAnswer
        Says which condition cannot be met, and how close it came.
    """
    etas = np.linspace(*PACKING_RANGE, SCAN)
    misses: list[tuple[float, float]] = []
    reasons: list[str] = []
    for eta in etas[::-1]:  # from the dense side: liquids are dense, and failures lie on the dilute side
        try:
            misses.append((float(eta), _pressure_miss(float(eta), liquid, accuracy)))
        except NoAnswer as reason:
            reasons.append(str(reason))
            if misses:
                break
            continue
        if len(misses) > 1 and misses[-1][1] * misses[-2][1] <= 0.0:
            low, high = misses[-1][0], misses[-2][0]
            eta_found = brentq(lambda e: _pressure_miss(e, liquid, accuracy), low, high, xtol=PACKING_TOLERANCE)
            return _report(float(eta_found), liquid, accuracy)
    raise NoAnswer(_why_not(liquid, misses, reasons))


def _fluid(liquid: PureLiquid) -> Mixture:
    return Mixture(1.0, 1.0, liquid.well_range)


def _reduced_temperature(eta: float, liquid: PureLiquid, accuracy: float) -> float:
    """T* at which the fluid of packing fraction eta has the liquid's U/(N kT)."""
    fluid = _fluid(liquid)

    def miss(t: float) -> float:
        solution = solve(
            fluid, State(t, packing_fraction=eta), closure=liquid.closure, accuracy=accuracy, on_failure="return"
        )
        if not solution.status.usable:
            raise NoAnswer(f"at packing fraction {eta:.3f}: {solution.message}")
        return solution.internal_energy / t - liquid.reduced_energy

    # U/N eps is between -8 and -3 for liquids and almost constant: a first estimate, then a bracket.
    warm = REDUCED_TEMPERATURE_RANGE[1]
    value = miss(warm)
    if value < 0.0:
        raise NoAnswer(
            f"at packing fraction {eta:.3f} the energy is below the measured one already at T* = {warm:g}: "
            "the liquid's residual energy is too small for a square well of this range"
        )
    previous = warm
    while True:
        contacts = (value + liquid.reduced_energy) * previous
        cold = min(0.97 * previous, contacts / liquid.reduced_energy * 0.97)
        if cold < REDUCED_TEMPERATURE_RANGE[0]:
            raise NoAnswer(
                f"at packing fraction {eta:.3f} the measured energy would need T* below "
                f"{REDUCED_TEMPERATURE_RANGE[0]:g}: the cohesion is too strong for a square well of this range"
            )
        value = miss(cold)
        if value <= 0.0:
            return float(brentq(miss, cold, previous, xtol=ENERGY_TOLERANCE))
        previous = cold


def _pressure_miss(eta: float, liquid: PureLiquid, accuracy: float) -> float:
    t = _reduced_temperature(eta, liquid, accuracy)
    route = energy_route(_fluid(liquid), State(t, packing_fraction=eta), liquid.closure, accuracy)
    return route.z - liquid.z


def _report(eta: float, liquid: PureLiquid, accuracy: float) -> Calibration:
    t = _reduced_temperature(eta, liquid, accuracy)
    state = State(t, packing_fraction=eta)
    solution = solve(_fluid(liquid), state, closure=liquid.closure, accuracy=accuracy)
    route = energy_route(_fluid(liquid), state, liquid.closure, accuracy)
    rt = GAS_CONSTANT * liquid.temperature
    to_kpa = rt / (liquid.molar_volume * 1e-3)
    density = density_from_molar_volume(liquid.molar_volume)
    return Calibration(
        liquid=liquid,
        diameter=(6.0 * eta / (math.pi * density)) ** (1.0 / 3.0),
        well_depth=liquid.temperature / t,
        packing_fraction=eta,
        reduced_temperature=t,
        residual_energy=solution.internal_energy / t * rt,
        pressure=route.z * to_kpa,
        virial_pressure=solution.virial_z * to_kpa,
    )


def _why_not(liquid: PureLiquid, misses: list[tuple[float, float]], reasons: list[str]) -> str:
    start = f"no square well with range {liquid.well_range:g} reproduces {liquid.name} at {liquid.temperature:g} K: "
    if misses:
        best = min(misses, key=lambda item: abs(item[1]))
        low, high = min(m[0] for m in misses), max(m[0] for m in misses)
        text = (
            f"with the measured energy the pressure condition Z = {liquid.z:.4g} is not met for packing fractions "
            f"{low:.3f} to {high:.3f} (closest: Z off by {best[1]:+.3g} at {best[0]:.3f})"
        )
        return start + text + (f"; beyond that range: {reasons[-1]}" if reasons else "")
    return start + (reasons[0] if reasons else "nothing could be solved")


def calibration_json(result: Calibration) -> dict[str, object]:
    """The JSON object of `localcomp calibrate`."""
    liquid = result.liquid
    return {
        "status": "calibrated",
        "name": liquid.name,
        "temperature": liquid.temperature,
        "closure": liquid.closure,
        "well_range": liquid.well_range,
        "diameter": result.diameter,
        "well_depth": result.well_depth,
        "units": {
            "diameter": "angstrom", "well_depth": "kelvin (eps/k)", "energy": "J/mol", "pressure": "kPa",
            "temperature": "kelvin", "molar_volume": "cm3/mol",
        },
        "reduced_temperature": result.reduced_temperature,
        "packing_fraction": result.packing_fraction,
        "molar_volume": liquid.molar_volume,
        "conditions": {
            "residual_energy": {"measured": liquid.residual_energy, "reached": result.residual_energy},
            "pressure": {"measured": liquid.pressure, "reached": result.pressure, "route": "energy"},
        },
        "virial_pressure": result.virial_pressure,
        "source": liquid.source,
    }  # fmt: skip
