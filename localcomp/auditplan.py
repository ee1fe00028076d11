"""What an audit solves beside the study's own states, and the findings put together from the store.

Beside each state: the same without wells, under the other shell rules, and under other closures; for a
class also some ternaries made of its species and each of their pairs alone.
"""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from concurrent.futures import Executor
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from localcomp.auditsettings import AuditSettings, companions_of
from localcomp.errors import BadInput, Problem
from localcomp.evidence import Array, Findings, Table, log_ratio
from localcomp.inputs import StateFile
from localcomp.shells import FirstMinimum, FixedMultiple, ShellRule, WellEdge, informative_multiple
from localcomp.store import Store
from localcomp.study import Case, Study
from localcomp.sweep import Progress, is_solved, run
from ozsolve import Mixture, State

TERNARY_COMPOSITIONS = ((1 / 3, 1 / 3, 1 / 3), (0.6, 0.2, 0.2), (0.2, 0.6, 0.2), (0.2, 0.2, 0.6))
STATE_COMPOSITIONS = (0.0, 0.25, 0.5, 0.75, 1.0)
STATE_TEMPERATURES = (1.0, 1.25, 1.6)
STATE_DENSITIES = (0.9, 1.0, 1.1)
"""The small class around a single state: its temperature and packing fraction times these."""
DENSEST = 0.49
"""Packing fractions above are close to freezing (hard spheres freeze at 0.494: Hoover and Ree, J. Chem. Phys. 49
(1968) 3609) and left out of the class around a state."""

Results = dict[str, dict[str, Any]]


@dataclass(frozen=True)
class AuditPlan:
    """States to solve, in the studies they are solved in.

    Attributes
    ----------
    study : Study
        As asked for.
    closures : tuple of str
        The judged one first.
    rules : tuple of ShellRule
        Other than the study's own.
    main : tuple of Case
        Under the judged closure.
    ternary : tuple of Case
    """

    study: Study
    closures: tuple[str, ...]
    rules: tuple[ShellRule, ...]
    main: tuple[Case, ...]
    ternary: tuple[Case, ...]

    def studies(self) -> list[Study]:
        """What to hand to `sweep.run`, one per shell rule."""
        own: list[Case] = []
        for closure in self.closures:
            own += [replace(case, closure=closure) for case in self.main]
            own += [_athermal(replace(case, closure=closure)) for case in self.main]
            own += [replace(case, closure=closure) for case in self.ternary]
            own += [replace(case, closure=closure) for parts in map(_binaries, self.ternary) for case in parts.values()]
        out = [_unique(replace(self.study, cases=tuple(own), closures=self.closures))]
        for rule in self.rules:
            cases = tuple(replace(case, closure=closure) for closure in self.closures for case in self.main)
            out.append(_unique(replace(self.study, cases=cases, rule=rule, closures=self.closures)))
        return out


def plan_audit(study: Study, settings: AuditSettings) -> AuditPlan:
    """What to solve for an audit of this study."""
    closures = (study.closures[0], *(settings.companions or companions_of(study.closures)))
    main = tuple(case for case in study.cases if case.closure == closures[0])
    if len({case.mixture.species for case in main}) > 1:
        allowed = "one number of species for all mixtures; audit binaries and ternaries in studies of their own"
        raise BadInput([Problem(str(study.path), "[[mixtures]]", "", allowed)])
    others = (WellEdge(), FirstMinimum(), informative_multiple(main[0].mixture) if main else FixedMultiple())
    rules = [r for r in others if not _same_shell(r, study.rule, main)]
    return AuditPlan(study, closures, tuple(rules), main, _ternaries(study, main))


def _same_shell(rule: ShellRule, own: ShellRule, cases: Sequence[Case]) -> bool:
    """Whether a rule gives the study's own shells in every state."""
    if rule == own:
        return True
    both = {rule.name, own.name}
    if both != {WellEdge.name, FixedMultiple.name}:
        return False
    multiple = rule.multiple if isinstance(rule, FixedMultiple) else own.multiple  # type: ignore[attr-defined]
    return all(bool(np.allclose(case.mixture.pairs.well_range, multiple, rtol=1e-12)) for case in cases)


def _unique(study: Study) -> Study:
    """The same states, each once."""
    found = dict(zip(study.keys(), study.cases, strict=True))
    return replace(study, cases=tuple(found.values()))


def _athermal(case: Case) -> Case:
    eta = case.mixture.packing_fraction(case.state)
    return Case(case.mixture.athermal(), State(1.0, case.state.mole_fractions, packing_fraction=eta), case.closure, {})


def _binaries(case: Case) -> dict[tuple[int, int], Case]:
    """Each pair of a mixture alone, in the same proportion, at the same temperature and packing fraction."""
    out = {}
    x = case.state.mole_fractions
    eta = case.mixture.packing_fraction(case.state)
    for i, j in itertools.combinations(range(len(x)), 2):
        if x[i] + x[j] > 0.0:
            share = x[i] / (x[i] + x[j])
            state = State(case.state.temperature, (share, 1.0 - share), packing_fraction=eta)
            out[i, j] = Case(case.mixture.subset((i, j)), state, case.closure, {})
    return out


def _ternaries(study: Study, main: Sequence[Case]) -> tuple[Case, ...]:
    """The study's own mixtures of three and more; for a class, ternaries of its corner species."""
    if not main or study.kind == "pair":
        return ()
    if main[0].mixture.species > 2:
        return tuple(main)
    if study.kind != "class":
        return ()
    species = list(dict.fromkeys((float(c.labels["size_ratio"]), float(c.labels["energy_ratio"])) for c in main))
    sizes, energies = sorted({s for s, _ in species}), sorted({e for _, e in species})
    corners = [(sizes[-1], energies[-1]), (sizes[-1], energies[0]), (sizes[0], energies[-1])]
    corners = [c for c in dict.fromkeys(corners) if c in species and c != (1.0, 1.0)]
    if len(corners) == 1 and len(species) > 1:
        corners.append(next(s for s in species if s not in corners))
    reduced = [float(c.labels["reduced_temperature"]) for c in main]
    axes = {name: sorted({float(c.labels[name]) for c in main}) for name in ("k", "l", "well_range")}
    packing = _extremes([c.mixture.packing_fraction(c.state) for c in main])
    out = []
    for (one, other), k, l_, reach in itertools.product(
        itertools.combinations(corners, 2), _extremes(axes["k"]), _extremes(axes["l"]), _extremes(axes["well_range"])
    ):
        mixture = Mixture([1.0, one[0], other[0]], [1.0, one[1], other[1]], reach, k=k, l=l_)
        names: dict[str, float | str] = {
            "second species": f"{one[0]:g}, {one[1]:g}", "third species": f"{other[0]:g}, {other[1]:g}",
            "k": k, "l": l_, "well_range": reach,
        }  # fmt: skip
        for level, eta in itertools.product(_extremes(reduced), packing):
            # the warmest of the pairs' temperatures: all three are liquids there
            temperature = max(
                c.state.temperature for c in main
                if c.labels["reduced_temperature"] == level
                and (c.labels["size_ratio"], c.labels["energy_ratio"]) in (one, other)
            )  # fmt: skip
            for x in TERNARY_COMPOSITIONS:
                out.append(Case(mixture, State(temperature, x, packing_fraction=eta), main[0].closure, dict(names)))
    return tuple(out)


def _extremes(values: list[float]) -> list[float]:
    return sorted({min(values), max(values)})


def study_of_state(request: StateFile) -> Study:
    """The small class around one state: compositions, temperatures upwards and packing fractions about it."""
    mixture, state = request.mixture, request.state
    size = mixture.species
    own = tuple(state.mole_fractions)
    if size == 2:
        fractions = sorted({*STATE_COMPOSITIONS, own[0]})
        compositions = [(x, 1.0 - x) if x != own[0] else own for x in fractions]
    else:
        towards = np.eye(size)
        compositions = [own, *(tuple(0.5 * (np.array(own) + corner)) for corner in towards)]
    eta = mixture.packing_fraction(state)
    packing = [eta * f for f in STATE_DENSITIES if f == 1.0 or eta * f < DENSEST]
    name = " + ".join(mixture.names)
    cases = [
        Case(mixture, State(state.temperature * t, x, packing_fraction=p), request.closure,
             {"mixture": name, "reduced_temperature": state.temperature * t})
        for p in packing for x in compositions for t in STATE_TEMPERATURES
    ]  # fmt: skip
    kind = "pair" if size == 2 else "mixtures"
    text = request.path.read_text(encoding="utf-8-sig")
    return Study(
        request.path, name, kind, request.units, request.rule, request.accuracy, (request.closure,), tuple(cases), text,
        request.audit,
    )  # fmt: skip


def solve_plan(
    plan: AuditPlan, store: Store, executor: Executor, workers: int, progress: Progress | None = None
) -> dict[str, Findings]:
    """Solve what the store does not have yet and put the findings together, one per closure.

    Raises
    ------
    StoreError
        If results cannot be written; what was stored is safe.
    """
    studies = plan.studies()
    total = sum(len(study.cases) for study in studies)
    before = failed = 0
    for study in studies:

        def report(present: int, _: int, now: int, before: int = before, failed: int = failed) -> None:
            if progress is not None:
                progress(before + present, total, failed + now)

        result = run(study, store, executor, workers, report)
        before += len(study.cases)
        failed += result.failed
    if progress is not None:
        progress(total, total, failed)
    return read_findings(plan, store)


def read_findings(plan: AuditPlan, store: Store) -> dict[str, Findings]:
    """Findings from stored results, one per closure; what is missing or failed is NaN."""
    known: Results = {}
    for study in plan.studies():
        keys = study.keys()
        known.update({key: r for key, r in zip(keys, store.results(keys), strict=True) if r is not None})
    return {closure: _findings(plan, closure, known) for closure in plan.closures}


def _findings(plan: AuditPlan, closure: str, known: Results) -> Findings:
    study = plan.study
    main = [replace(case, closure=closure) for case in plan.main]

    def counts(cases: Sequence[Case], rule: ShellRule) -> Array:
        return np.array([_counts(case, known.get(case.key(study.accuracy, rule))) for case in cases])

    rules = {rule.description: counts(main, rule) for rule in plan.rules}
    ternary = [replace(case, closure=closure) for case in plan.ternary]
    many = _table(ternary, counts(ternary, study.rule), known, study) if ternary else None
    binary = None
    if many is not None:
        binary = np.full_like(many.counts, np.nan)
        for n, case in enumerate(ternary):
            for (i, j), pair in _binaries(case).items():
                ratio = log_ratio(_counts(pair, known.get(pair.key(study.accuracy, study.rule))))
                binary[n, i, j], binary[n, j, i] = ratio[0, 1], ratio[1, 0]
    return Findings(
        _table(main, counts(main, study.rule), known, study),
        counts([_athermal(case) for case in main], study.rule),
        rules,  # the same under every closure, answered or not: closures are compared item by item
        many,
        binary,
    )


def _counts(case: Case, result: dict[str, Any] | None) -> Array:
    """N_ij/x_j, shape (s, s), from stored counts and ratios; NaN where there is no solution."""
    x = np.array(case.state.mole_fractions)
    size = len(x)
    if result is None or not is_solved(result):
        return np.full((size, size), np.nan)
    ratio = np.array(result["neighbor_ratios"], float)
    number = np.array(result["coordination_numbers"], float)
    present = x > 0.0
    # through a species that is there: N_ii/x_i = (N_ij/x_j)/R_ij
    j = int(np.argmax(x))
    own = number[:, j] / x[j] / ratio[:, j]
    own[present] = np.diag(number)[present] / x[present]
    return np.asarray(own[:, None] * ratio)


def _table(cases: Sequence[Case], counts: Array, known: Results, study: Study) -> Table:
    mixtures: dict[bytes, int] = {}
    number, wells, errors = [], [], []
    for case in cases:
        pairs = case.mixture.pairs
        identity = pairs.diameter.tobytes() + pairs.well_depth.tobytes() + pairs.well_edge.tobytes()
        number.append(mixtures.setdefault(identity, len(mixtures)))
        result = known.get(case.key(study.accuracy, study.rule))
        solved = result is not None and is_solved(result)
        size = case.mixture.species
        rho = float(case.mixture.densities(case.state).sum())
        wells.append(rho * np.array(result["well_integrals"]) if result and solved else np.full((size, size), np.nan))
        errors.append(np.full((size, size), result["relative_error"] if result and solved else np.nan))
    return Table(
        np.array(number),
        np.array([case.state.mole_fractions for case in cases]),
        np.array([case.state.temperature for case in cases]),
        np.array([case.mixture.packing_fraction(case.state) for case in cases]),
        np.array([case.mixture.pairs.well_depth for case in cases]),
        np.array([case.mixture.pairs.diameter for case in cases]),
        counts,
        np.array(wells),
        np.array(errors),
        tuple(dict(case.labels) for case in cases),
        tuple(tuple(case.mixture.names) for case in cases),
    )
