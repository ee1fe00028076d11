"""Simple components: measured liquids to calibrate on, and square wells from published second virial coefficients.

Two kinds of square-well parameters, never mixed. Virial ones reproduce the gas's B2(T); with them the
liquid lies inside the two-phase region of the model. Liquid-calibrated ones (`calibrate`) reproduce the
liquid's energy and pressure at its density; they do not give the gas's B2.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from importlib.resources import files
from pathlib import Path
from typing import Any

import numpy as np

from localcomp.errors import BadInput, Problem
from localcomp.inputs import positive
from localcomp.tables import Table, load_toml, nearest
from localcomp.units import AVOGADRO_A3_PER_CM3

BUNDLED = "components.toml"


@dataclass(frozen=True)
class LiquidPoint:
    """A saturated liquid.

    Attributes
    ----------
    temperature : float
        K.
    molar_volume : float
        cm3/mol.
    residual_energy : float
        U - U(ideal gas), J/mol, negative.
    pressure : float
        Of saturation, kPa.
    source : str
    """

    temperature: float
    molar_volume: float
    residual_energy: float
    pressure: float
    source: str


@dataclass(frozen=True)
class VirialFit:
    """B2 = a - b exp(c/T), which is a square well: b0 = a - b, lam^3 = a/(a - b), eps/k = c.

    Attributes
    ----------
    a, b : float
        cm3/mol.
    c : float
        K.
    temperatures : tuple of float
        Range of the fit, K.
    source : str
    """

    a: float
    b: float
    c: float
    temperatures: tuple[float, float]
    source: str

    @property
    def diameter(self) -> float:
        """sigma = (3 b0/2 pi N_A)^(1/3), angstrom."""
        return float((3.0 * (self.a - self.b) / (2.0 * math.pi * AVOGADRO_A3_PER_CM3)) ** (1.0 / 3.0))

    @property
    def well_range(self) -> float:
        """lam."""
        return float((self.a / (self.a - self.b)) ** (1.0 / 3.0))

    @property
    def well_depth(self) -> float:
        """eps/k, K."""
        return self.c

    def second_virial(self, temperature: float) -> float:
        """B2, cm3/mol: b0 [1 - (lam^3 - 1)(exp(eps/kT) - 1)] (Hirschfelder, Curtiss and Bird 1954, section 3.5)."""
        return float(self.a - self.b * np.exp(self.c / temperature))


@dataclass(frozen=True)
class Component:
    """One component.

    Attributes
    ----------
    name : str
    liquids : tuple of LiquidPoint
    virial : VirialFit or None
    """

    name: str
    liquids: tuple[LiquidPoint, ...]
    virial: VirialFit | None


def load_components(extra: Path | None = None) -> dict[str, Component]:
    """The bundled components, and those of a file in the same form, which replace bundled ones of the same name.

    Raises
    ------
    BadInput
        With every mistake found in the file.

    Examples
    --------
    >>> argon = load_components()["argon"]
    >>> round(argon.virial.diameter, 4), round(argon.virial.well_range, 4)
    (3.0246, 1.6409)
    """
    bundled = Path(str(files("localcomp") / "data" / BUNDLED))
    found = {component.name: component for component in _read(bundled)}
    if extra is not None:
        found.update({component.name: component for component in _read(extra)})
    return found


def component_named(name: str, components: dict[str, Component]) -> Component:
    """One component by name, letters of either case.

    Raises
    ------
    BadInput
        With the nearest name.
    """
    for known, component in components.items():
        if known.lower() == name.strip().lower():
            return component
    allowed = f"one of: {', '.join(components)}{nearest(name.lower(), components)}"
    raise BadInput([Problem("command line", "NAME", name, allowed)])


def _read(path: Path) -> list[Component]:
    problems: list[Problem] = []
    content = load_toml(path)
    top = Table(str(path), "", content, problems)
    top.known(("component",))
    entries = content.get("component")
    if not isinstance(entries, list) or not entries:
        raise BadInput([Problem(str(path), "[[component]]", "", "write each component as a [[component]] table")])
    found = [_component(Table(str(path), "component", entry, problems)) for entry in entries]
    if problems:
        raise BadInput(problems)
    return [component for component in found if component is not None]


def _component(table: Table) -> Component | None:
    table.known(("name", "liquid", "virial"))
    name = table.text("name", "")
    if not name:
        table.missing("name", "every component has a name")
    points = table.content.get("liquid", [])
    if not isinstance(points, list):
        table.complain("liquid", points, "write each temperature as a [[component.liquid]] table")
        points = []
    liquids = [_liquid(Table(table.file, "component.liquid", point, table.problems)) for point in points]
    virial = None
    if "virial" in table.content:
        virial = _virial(Table(table.file, "component.virial", table.content["virial"], table.problems))
    return Component(name, tuple(point for point in liquids if point is not None), virial)


def _liquid(table: Table) -> LiquidPoint | None:
    table.known(("temperature", "molar_volume", "residual_energy", "pressure", "source"))
    numbers = [
        table.number("temperature", "a positive number, K", positive),
        table.number("molar_volume", "a positive number, cm3/mol", positive),
        table.number("residual_energy", "a negative number, J/mol", lambda v: v < 0.0),
        table.number("pressure", "a number of 0 or more, kPa", lambda v: v >= 0.0),
    ]
    source = _source(table)
    if any(number is None for number in numbers) or not source:
        return None
    temperature, volume, energy, pressure = (float(number) for number in numbers if number is not None)
    return LiquidPoint(temperature, volume, energy, pressure, source)


def _virial(table: Table) -> VirialFit | None:
    table.known(("a", "b", "c", "temperatures", "source"))
    a = table.number("a", "a positive number, cm3/mol", positive)
    b = table.number("b", "a positive number below a, cm3/mol", lambda v: v > 0.0 and (a is None or v < a))
    c = table.number("c", "a positive number, K", positive)
    limits = table.numbers("temperatures", "two positive numbers, K", positive, size=2)
    source = _source(table)
    if a is None or b is None or c is None or limits is None or not source:
        return None
    return VirialFit(a, b, c, (limits[0], limits[1]), source)


def _source(table: Table) -> str:
    source = table.text("source", "")
    if not source:
        table.missing("source", "say where the numbers come from")
    return source


def component_json(component: Component) -> dict[str, Any]:
    """One component as plain values."""
    virial = component.virial
    return {
        "name": component.name,
        "liquid": [
            {
                "temperature_K": p.temperature, "molar_volume_cm3_per_mol": p.molar_volume,
                "residual_energy_J_per_mol": p.residual_energy, "pressure_kPa": p.pressure, "source": p.source,
            }
            for p in component.liquids
        ],
        "virial": None
        if virial is None
        else {
            "a": virial.a, "b": virial.b, "c": virial.c, "temperatures_K": list(virial.temperatures),
            "diameter_angstrom": virial.diameter, "well_range": virial.well_range, "well_depth_K": virial.well_depth,
            "source": virial.source,
        },
    }  # fmt: skip
