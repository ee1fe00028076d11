"""Study files: one pair, a class of pairs, or explicit mixtures, under lists of conditions.

A study is expanded into cases (a mixture in a state under a closure) in a fixed order. Every mistake
in the file is reported at once.
"""

from __future__ import annotations

import hashlib
import itertools
import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path
from typing import TypeGuard

import numpy as np
from numpy.typing import NDArray

from localcomp.auditsettings import AuditSettings, read_audit
from localcomp.errors import BadInput, Problem
from localcomp.inputs import MAX_PACKING, not_this_kind, read_accuracy, read_mixture, read_shell, read_units
from localcomp.shells import FixedMultiple, ShellRule
from localcomp.tables import SIZE_LIMITS, Table, as_number, load_toml, of_usable_size
from localcomp.units import Units
from ozsolve import CLOSURES, InputError, Mixture, State

SCHEMA_VERSION = 2
"""Version of what a stored result means; part of every key, so that old results are never mixed in."""
MOST_CASES = 1_000_000
REFERENCES = ("mean", "first", "second", "absolute")
CLASS_KEYS = ("size_ratio", "energy_ratio", "k", "l", "well_range")
CONDITION_KEYS = (
    "temperature", "temperature_reference", "packing_fraction", "composition", "mole_fractions", "closures",
)  # fmt: skip


@dataclass(frozen=True)
class Case:
    """One state to solve.

    Attributes
    ----------
    mixture, state, closure :
        What is solved.
    labels : dict
        How the study calls it: size_ratio, energy_ratio, k, reduced temperature, ...
    """

    mixture: Mixture
    state: State
    closure: str
    labels: dict[str, float | str]

    def key(self, accuracy: float, rule: ShellRule) -> str:
        """Hash of physics, closure, accuracy, shell rule and schema version."""
        pairs = self.mixture.pairs
        multiple = rule.multiple if isinstance(rule, FixedMultiple) else 0.0
        words = f"{SCHEMA_VERSION} {self.closure} {rule.name} {self.mixture.species}"
        numbers = [float(accuracy), multiple, float(self.state.temperature)]
        tables = (np.array(numbers), pairs.diameter, pairs.well_depth, pairs.well_edge, self.densities)
        content = b"".join(table.astype("<f8", copy=False).tobytes() for table in tables)
        return hashlib.sha256(words.encode() + b"\0" + content).hexdigest()

    @cached_property
    def densities(self) -> NDArray[np.float64]:
        """rho_i, shape (s,)."""
        return self.mixture.densities(self.state)


@dataclass(frozen=True)
class Study:
    """A checked study file, expanded.

    Attributes
    ----------
    path : Path
    name : str
    kind : {"class", "pair", "mixtures"}
    units : Units
    rule : ShellRule
    accuracy : float
    closures : tuple of str
    cases : tuple of Case
        In a fixed order: closure, mixture, packing fraction, composition, temperature.
    text : str
        The file as read, kept with the results.
    audit : AuditSettings
        How the class is to be judged.
    """

    path: Path
    name: str
    kind: str
    units: Units
    rule: ShellRule
    accuracy: float
    closures: tuple[str, ...]
    cases: tuple[Case, ...]
    text: str
    audit: AuditSettings = field(default_factory=AuditSettings)

    def keys(self) -> list[str]:
        """The key of every case."""
        return [case.key(self.accuracy, self.rule) for case in self.cases]


def read_study(path: str | Path) -> Study:
    """Read, check and expand a study file.

    Raises
    ------
    BadInput
        With every mistake found: file, key, value, what is allowed.
    """
    path = Path(path)
    content = load_toml(path)
    problems: list[Problem] = []
    file = str(path)
    top = Table(file, "", content, problems)
    not_this_kind(top, {"state": "a state file: localcomp state", "fluid": "a pure-liquid file: localcomp calibrate"})
    top.known(("study", "class", "pair", "mixtures", "conditions", "units", "shell", "numerics", "audit"))
    heading = Table(file, "study", content.get("study", {}), problems)
    heading.known(("name",))
    name = heading.text("name", path.stem)
    units = read_units(Table(file, "units", content.get("units", {}), problems))
    rule = read_shell(Table(file, "shell", content.get("shell", {}), problems))
    accuracy = read_accuracy(Table(file, "numerics", content.get("numerics", {}), problems))
    audit = read_audit(Table(file, "audit", content.get("audit", {}), problems))
    kinds = [kind for kind in ("class", "pair", "mixtures") if kind in content]
    if len(kinds) != 1:
        top.missing("[class], [pair] or [[mixtures]]", "give exactly one of the three")
        kind = ""
        mixtures: list[tuple[Mixture, dict[str, float | str]]] = []
    else:
        kind = kinds[0]
        mixtures = _mixtures(file, kind, content[kind], problems)
        if kind == "class" and (units.length != "reduced" or units.energy != "reduced"):
            top.complain("[units]", content["units"], "a [class] is in reduced units: the first species sets them")
    conditions = Table(file, "conditions", content.get("conditions", {}), problems)
    if "conditions" not in content:
        top.missing("[conditions]", "a [conditions] table is needed")
    cases, closures = _expand(conditions, mixtures, kind)
    if problems:
        raise BadInput(problems)
    text = path.read_text(encoding="utf-8-sig")
    return Study(path, name, kind, units, rule, accuracy, closures, cases, text, audit)


def values(
    table: Table, key: str, allowed: str, accept: Callable[[float], bool], default: list[float] | None = None
) -> list[float]:
    """A number, a list of numbers, or a range {from, to, steps}; empty after a complaint."""
    if key not in table.content:
        if default is None:
            table.missing(key, f"{allowed}: a number, a list, or a range like {{ from = 1, to = 2, steps = 5 }}")
            return []
        return default
    raw = table.content[key]
    found: list[float | None]
    if isinstance(raw, dict):
        first, last, steps = as_number(raw.get("from")), as_number(raw.get("to")), raw.get("steps")
        if set(raw) != {"from", "to", "steps"} or first is None or last is None or not _is_count(steps):
            table.complain(key, raw, f"{allowed}; a range is {{ from = 1, to = 2, steps = 5 }} with 2 to 1000 steps")
            return []
        if not (of_usable_size(first) and of_usable_size(last)):
            table.complain(key, raw, allowed + SIZE_LIMITS)
            return []
        found = [float(v) for v in np.linspace(first, last, steps)]
    elif isinstance(raw, list):
        found = [as_number(v) for v in raw]
    else:
        found = [as_number(raw)]
    good = [v for v in found if v is not None and accept(v)]
    if not good or len(good) != len(found):
        table.complain(key, raw, f"{allowed}: a number, a list, or a range {{ from, to, steps }}")
        return []
    if not all(map(of_usable_size, good)):
        table.complain(key, raw, allowed + SIZE_LIMITS)
        return []
    return list(dict.fromkeys(good))


def _is_count(value: object) -> TypeGuard[int]:
    return isinstance(value, int) and not isinstance(value, bool) and 2 <= value <= 1000


def _mixtures(
    file: str, kind: str, content: object, problems: list[Problem]
) -> list[tuple[Mixture, dict[str, float | str]]]:
    if kind == "class":
        return _class(Table(file, "class", content, problems))
    if kind == "pair":
        table = Table(file, "pair", content, problems)
        k_values: list[float | None] = [None]
        if _plain_k(table):
            k_values = list(values(table, "k", "numbers below 1", lambda v: -10.0 <= v < 1.0, [0.0]))
            if not k_values:  # the other mistakes of the table are worth telling too
                rest = {key: value for key, value in table.content.items() if key != "k"}
                read_mixture(Table(file, "pair", rest, problems))
        out = []
        for k in k_values:
            inner = dict(table.content)
            if k is not None:
                inner["k"] = k
            mixture = read_mixture(Table(file, "pair", inner, problems))
            if mixture is None:
                return []
            if mixture.species != 2:
                table.complain("diameter", inner["diameter"], "a pair has two species; use [[mixtures]] for more")
                return []
            labels: dict[str, float | str] = {"k": k} if k is not None else {}
            out.append((mixture, {"mixture": " + ".join(mixture.names), **labels}))
        return out
    if not isinstance(content, list) or not content:
        problems.append(Problem(file, "[[mixtures]]", "", "write each mixture as a [[mixtures]] table"))
        return []
    found = [read_mixture(Table(file, "mixtures", entry, problems)) for entry in content]
    return [
        (m, {"mixture": " + ".join(m.names), "mixture_number": n + 1}) for n, m in enumerate(found) if m is not None
    ]


def _plain_k(table: Table) -> bool:
    """Whether k is a number, a list of numbers or a range (a full matrix is left to the mixture)."""
    raw = table.content.get("k", 0.0)
    return not (isinstance(raw, list) and any(isinstance(row, list) for row in raw))


def _class(table: Table) -> list[tuple[Mixture, dict[str, float | str]]]:
    """Pairs by size ratio, energy ratio, k, l and well range; the first species has sigma = eps = 1."""
    table.known(CLASS_KEYS)
    before = len(table.problems)
    lists = [
        values(table, "size_ratio", "numbers in [0.05, 20]", lambda v: 0.05 <= v <= 20.0),
        values(table, "energy_ratio", "numbers in [0, 20]", lambda v: 0.0 <= v <= 20.0),
        values(table, "k", "numbers below 1", lambda v: -10.0 <= v < 1.0, [0.0]),
        values(table, "l", "numbers below 1", lambda v: -1.0 <= v < 1.0, [0.0]),
        values(table, "well_range", "numbers in (1, 4]", lambda v: 1.0 < v <= 4.0, [1.5]),
    ]
    if len(table.problems) > before:
        return []
    count = math.prod(len(found) for found in lists)
    if count > MOST_CASES:  # before they are built: five ranges of a thousand would never end
        table.complain("size_ratio", len(lists[0]), f"the class has {count} pairs; up to {MOST_CASES} are allowed")
        return []
    out: list[tuple[Mixture, dict[str, float | str]]] = []
    for size, energy, k, l_, reach in itertools.product(*lists):
        try:
            mixture = Mixture([1.0, size], [1.0, energy], reach, k=k, l=l_)
        except InputError as error:
            table.complain(error.field, error.value, error.allowed)
            return []
        out.append((mixture, {"size_ratio": size, "energy_ratio": energy, "k": k, "l": l_, "well_range": reach}))
    return out


def _expand(
    table: Table, mixtures: list[tuple[Mixture, dict[str, float | str]]], kind: str
) -> tuple[tuple[Case, ...], tuple[str, ...]]:
    table.known(CONDITION_KEYS)
    before = len(table.problems)
    temperatures = values(table, "temperature", "positive numbers", lambda v: v > 0.0)
    packing = values(table, "packing_fraction", f"numbers inside (0, {MAX_PACKING})", lambda v: 0.0 < v < MAX_PACKING)
    reference = table.word("temperature_reference", REFERENCES, "mean" if kind == "class" else "absolute")
    closures = _closures(table)
    incomplete = before > 0 or not mixtures  # a mixture that could not be read may have had any number of species
    sizes = set() if incomplete else {mixture.species for mixture, _ in mixtures}
    compositions = _compositions(table, sizes)
    for mixture, _ in mixtures:
        if temperature_unit(mixture, reference) <= 0.0:
            table.complain(
                "temperature_reference",
                reference,
                f"the depth it names is {temperature_unit(mixture, reference):g}; take another one of: "
                f"{', '.join(REFERENCES)}",
            )
            break
    if len(table.problems) > before or not mixtures:
        return (), closures
    count = len(closures) * len(mixtures) * len(packing) * len(compositions) * len(temperatures)
    if count > MOST_CASES:
        table.complain(
            "temperature", len(temperatures), f"the study has {count} states; up to {MOST_CASES} are allowed"
        )
        return (), closures
    return tuple(_cases(table, mixtures, closures, packing, compositions, temperatures, reference)), closures


def _cases(
    table: Table, mixtures: list[tuple[Mixture, dict[str, float | str]]], closures: tuple[str, ...],
    packing: list[float], compositions: list[tuple[float, ...]], temperatures: list[float], reference: str,
) -> Iterator[Case]:  # fmt: skip
    for closure, (mixture, labels), eta, fractions, reduced in itertools.product(
        closures, mixtures, packing, compositions, temperatures
    ):
        if len(fractions) != mixture.species:
            continue
        unit = temperature_unit(mixture, reference)
        try:
            state = State(reduced * unit, fractions, packing_fraction=eta)
            case = Case(mixture, state, closure, {**labels, "reduced_temperature": reduced})
            _ = case.densities
            mixture.reduced_depths(state)
        except InputError as error:
            table.complain(error.field, error.value, error.allowed)
            return
        yield case


def temperature_unit(mixture: Mixture, reference: str) -> float:
    """The energy that reduces temperatures: mean or one species' well depth, or 1 for absolute ones."""
    depth = np.diag(mixture.pairs.well_depth)
    if reference == "first":
        return float(depth[0])
    if reference == "second":
        return float(depth[1]) if len(depth) > 1 else float(depth[0])
    return float(depth.mean()) if reference == "mean" else 1.0


def _closures(table: Table) -> tuple[str, ...]:
    raw = table.content.get("closures", ["rhnc"])
    names = [raw] if isinstance(raw, str) else raw
    if not isinstance(names, list) or not names or any(not isinstance(n, str) or n not in CLOSURES for n in names):
        table.complain("closures", raw, f"a list out of: {', '.join(CLOSURES)}")
        return ("rhnc",)
    return tuple(dict.fromkeys(names))


def _compositions(table: Table, sizes: set[int]) -> list[tuple[float, ...]]:
    """Mole fractions: `composition` (of the first of two species) or `mole_fractions` (rows, each for the mixtures
    with as many species); `sizes` empty when they are not known."""
    if "mole_fractions" in table.content:
        raw = table.content["mole_fractions"]
        rows = raw if isinstance(raw, list) and raw and all(isinstance(r, list) for r in raw) else [raw]
        out = []
        for row in rows:
            numbers = [as_number(v) for v in row] if isinstance(row, list) else [None]
            good = [v for v in numbers if v is not None and 0.0 <= v <= 1.0]
            fits = not sizes or len(good) in sizes
            if len(good) != len(numbers) or not fits or not math.isclose(sum(good), 1.0, abs_tol=1e-9):
                lengths = " or ".join(map(str, sorted(sizes))) if sizes else "as many as species"
                table.complain("mole_fractions", row, f"rows of {lengths} numbers in [0, 1] that sum to 1")
                return []
            out.append(tuple(good))
        without = sizes - {len(row) for row in out}
        if without:
            table.complain("mole_fractions", raw, f"no row has {min(without)} numbers, as a mixture needs")
            return []
        return out
    if sizes - {2}:
        table.missing("mole_fractions", "rows of mole fractions, one number per species")
        return []
    found = values(
        table, "composition", "mole fractions of the first species in [0, 1] (0 and 1: infinite dilution)",
        lambda v: 0.0 <= v <= 1.0,
    )  # fmt: skip
    return [(x, 1.0 - x) for x in found]
