"""State files: TOML in, checked once, every mistake named."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np

from localcomp.auditsettings import AuditSettings, read_audit
from localcomp.errors import BadInput, Problem
from localcomp.shells import RULES, FixedMultiple, ShellRule, make_rule
from localcomp.tables import Table, as_number, load_toml
from localcomp.units import ENERGY_UNITS, LENGTH_UNITS, Units, density_from_molar_volume
from ozsolve import CLOSURES, InputError, Mixture, PairOverride, State
from ozsolve import DEFAULT_ACCURACY as DEFAULT_ACCURACY

MAX_SPECIES = 8
MAX_PACKING = 0.55
MIXTURE_KEYS = ("names", "diameter", "well_depth", "well_range", "k", "l", "pairs")
STATE_KEYS = ("temperature", "packing_fraction", "molar_volume", "density", "mole_fractions", "closure")
PAIR_KEYS = ("between", "diameter", "well_depth", "well_range")


@dataclass(frozen=True)
class StateFile:
    """A checked state file.

    Attributes
    ----------
    path : Path
    units : Units
    mixture : Mixture
        Lengths and energies in the file's units.
    state : State
    closure : str
    accuracy : float
        Relative, on coordination numbers.
    rule : ShellRule
    audit : AuditSettings
        How `localcomp audit` judges the class around the state.
    """

    path: Path
    units: Units
    mixture: Mixture
    state: State
    closure: str
    accuracy: float
    rule: ShellRule
    audit: AuditSettings = field(default_factory=AuditSettings)


def not_this_kind(top: Table, signs: dict[str, str]) -> None:
    """Refuse a file that is plainly meant for another command.

    Raises
    ------
    BadInput
        Naming the command it is for.
    """
    for table, what in signs.items():
        if table in top.content:
            raise BadInput([Problem(top.file, f"[{table}]", "", f"this looks like {what} takes it")])


def positive(value: float) -> bool:
    """Accept positive numbers."""
    return value > 0.0


def read_state(path: str | Path) -> StateFile:
    """Read and check a state file.

    Raises
    ------
    BadInput
        With every mistake found: file, key, value, what is allowed.
    """
    path = Path(path)
    content = load_toml(path)
    problems: list[Problem] = []
    top = Table(str(path), "", content, problems)
    not_this_kind(top, {"fluid": "a pure-liquid file: localcomp calibrate", "conditions": "a study: localcomp sweep"})
    top.known(("mixture", "state", "units", "shell", "numerics", "audit"))
    for needed in ("mixture", "state"):
        if needed not in content:
            top.missing(f"[{needed}]", f"a [{needed}] table is needed")
    units = read_units(Table(str(path), "units", content.get("units", {}), problems))
    rule = read_shell(Table(str(path), "shell", content.get("shell", {}), problems))
    accuracy = read_accuracy(Table(str(path), "numerics", content.get("numerics", {}), problems))
    audit = read_audit(Table(str(path), "audit", content.get("audit", {}), problems))
    mixture = read_mixture(Table(str(path), "mixture", content["mixture"], problems)) if "mixture" in content else None
    result = None
    if "state" in content:
        table = Table(str(path), "state", content["state"], problems)
        result = _state(table, mixture, units)
    if problems or mixture is None or result is None:
        raise BadInput(problems)
    state, closure = result
    return StateFile(path, units, mixture, state, closure, accuracy, rule, audit)


def read_units(table: Table) -> Units:
    """The [units] table."""
    table.known(("length", "energy"))
    return Units(table.word("length", LENGTH_UNITS, "reduced"), table.word("energy", ENERGY_UNITS, "reduced"))


def read_shell(table: Table) -> ShellRule:
    """The [shell] table."""
    table.known(("rule", "multiple"))
    name = table.word("rule", RULES, "well_edge")
    multiple = table.number(
        "multiple", "a number between 1 and 4 (shell radius in sigma_ij)", lambda v: 1.0 < v <= 4.0, default=1.5
    )
    if "multiple" in table.content and name != FixedMultiple.name:
        table.complain("multiple", table.content["multiple"], f'is only used with rule = "{FixedMultiple.name}"')
    return make_rule(name, multiple or 1.5)


def read_accuracy(table: Table) -> float:
    """The [numerics] table."""
    table.known(("accuracy",))
    value = table.number(
        "accuracy",
        "a number between 1e-10 and 1e-2 (relative, on coordination numbers)",
        lambda v: 1e-10 <= v <= 1e-2,
        default=DEFAULT_ACCURACY,
    )
    return value if value is not None else DEFAULT_ACCURACY


def read_mixture(table: Table) -> Mixture | None:
    """A mixture's table; None after a complaint."""
    before = len(table.problems)
    table.known(MIXTURE_KEYS)
    diameter = table.numbers("diameter", "a list of positive numbers, one per species", positive, size=None)
    size = len(diameter) if diameter is not None else None
    if size is not None and size > MAX_SPECIES:
        table.complain("diameter", diameter, f"up to {MAX_SPECIES} species")
        return None
    depth = table.numbers("well_depth", "a list of finite numbers, one per species", math.isfinite, size=size)
    reach = [1.5]
    if "well_range" in table.content:
        reach = (
            table.numbers(
                "well_range", "larger than 1, at most 4: a number or a list", lambda v: 1.0 < v <= 4.0, size=size,
                scalar=True,
            )
            or reach
        )  # fmt: skip
    k = _deviation(table, "k", size)
    l_ = _deviation(table, "l", size)
    names = _names(table, size)
    labels = names or [str(n + 1) for n in range(size or 0)]
    overrides = _pairs(table, labels) if names or "names" not in table.content else ()
    if len(table.problems) > before or diameter is None or depth is None:
        return None
    try:
        return Mixture(diameter, depth, reach, k=k, l=l_, names=names, overrides=overrides)
    except InputError as error:
        labels = names or [str(n + 1) for n in range(len(diameter))]
        field = re.sub(r"\((\d+), (\d+)\)", lambda m: " - ".join(labels[int(n)] for n in m.groups()), error.field)
        table.complain(field, error.value, error.allowed)
        return None


def _names(table: Table, size: int | None) -> list[str] | None:
    raw = table.content.get("names")
    if raw is None:
        return None
    if not isinstance(raw, list) or not all(
        isinstance(n, str) and n.strip() and n.isprintable() and len(n) <= 40 for n in raw
    ):
        table.complain("names", raw, "a list of short names, one per species")
        return None
    if size is not None and (len(raw) != size or len(set(raw)) != size):
        table.complain("names", raw, f"{size} different names, one per species")
        return None
    return list(raw)


def _deviation(table: Table, key: str, size: int | None) -> Any:
    """k_ij or l_ij: a number, or a full symmetric matrix with a zero diagonal."""
    raw = table.content.get(key, 0.0)
    allowed = f"a number below 1, or a full symmetric {size or 'n'} x {size or 'n'} matrix with a zero diagonal"
    value = as_number(raw)
    if value is not None:
        if value >= 1.0 or value < -10.0:
            table.complain(key, raw, allowed)
            return 0.0
        return value
    rows = raw if isinstance(raw, list) else [raw]
    matrix = [[as_number(v) for v in row] if isinstance(row, list) else [None] for row in rows]
    shape_ok = size is not None and len(matrix) == size and all(len(row) == size for row in matrix)
    if not shape_ok or any(v is None or not -10.0 <= v < 1.0 for row in matrix for v in row):
        table.complain(key, raw, allowed)
        return 0.0
    array = np.array(matrix, dtype=np.float64)
    if not np.array_equal(array, array.T) or np.any(np.diag(array) != 0.0):
        table.complain(key, raw, allowed)
        return 0.0
    return array


def _pairs(table: Table, names: list[str]) -> tuple[PairOverride, ...]:
    raw = table.content.get("pairs", [])
    if not isinstance(raw, list):
        table.complain("pairs", raw, "write each pair as a [[mixture.pairs]] table")
        return ()
    found: list[PairOverride] = []
    seen: set[frozenset[str]] = set()
    for entry in raw:
        pair = Table(table.file, "mixture.pairs", entry, table.problems)
        pair.known(PAIR_KEYS)
        between = pair.content.get("between")
        if (
            not isinstance(between, list)
            or len(between) != 2
            or between[0] == between[1]
            or any(name not in names for name in between)
        ):
            pair.complain("between", between, f"two different species out of names = {names}")
            continue
        if frozenset(between) in seen:
            pair.complain("between", between, "this pair is given twice")
            continue
        seen.add(frozenset(between))
        found.append(
            PairOverride(
                names.index(between[0]),
                names.index(between[1]),
                diameter=pair.optional_number("diameter", "a positive number", positive),
                well_depth=pair.optional_number("well_depth", "a finite number", math.isfinite),
                well_range=pair.optional_number("well_range", "larger than 1, at most 4", lambda v: 1.0 < v <= 4.0),
            )
        )
    return tuple(found)


def _state(table: Table, mixture: Mixture | None, units: Units) -> tuple[State, str] | None:
    before = len(table.problems)
    table.known(STATE_KEYS)
    temperature = table.number("temperature", "a positive number (kT, or kelvin)", positive)
    closure = table.word("closure", CLOSURES, "rhnc")
    size = mixture.species if mixture is not None else None
    if size == 1 and "mole_fractions" not in table.content:
        fractions: list[float] | None = [1.0]
    else:
        fractions = table.numbers(
            "mole_fractions", "numbers in [0, 1] that sum to 1", lambda v: 0.0 <= v <= 1.0, size=size
        )
    if fractions is not None and abs(sum(fractions) - 1.0) > 1e-9:
        table.complain("mole_fractions", fractions, f"must sum to 1, not {sum(fractions):.10g}")
    packing, density = _density(table, units)
    if len(table.problems) > before or temperature is None or fractions is None:
        return None
    try:
        state = State(temperature, tuple(fractions), packing_fraction=packing, density=density)
        if mixture is not None:
            mixture.densities(state)
            mixture.reduced_depths(state)
    except InputError as error:
        key = "molar_volume" if error.field == "density" and "molar_volume" in table.content else error.field
        table.complain(key, table.content.get(key, error.value), error.allowed)
        return None
    return state, closure


def _density(table: Table, units: Units) -> tuple[float | None, float | None]:
    """(packing fraction, number density), one of them None."""
    given = [key for key in ("packing_fraction", "molar_volume", "density") if key in table.content]
    if len(given) != 1:
        message = "give exactly one of packing_fraction, molar_volume, density"
        if given:
            table.complain(" and ".join(given), [table.content[key] for key in given], message)
        else:
            table.missing("packing_fraction", message)
        return None, None
    key = given[0]
    if key == "packing_fraction":
        return table.number(key, f"inside (0, {MAX_PACKING})", lambda v: 0.0 < v < MAX_PACKING), None
    value = table.number(key, "a positive number", positive)
    if key == "molar_volume":
        if units.length != "angstrom":
            table.complain(key, table.content[key], 'needs [units] length = "angstrom" (it is in cm3/mol)')
            return None, None
        return None, None if value is None else density_from_molar_volume(value)
    return None, value
