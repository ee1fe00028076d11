"""Tables behind the figures of an audit."""

from __future__ import annotations

import itertools
from collections.abc import Sequence

import numpy as np

from localcomp.audit import Audit, multiplicity
from localcomp.claims import CLAIMS
from localcomp.evidence import Array, Index, log_ratio, stated_counts
from localcomp.figures.multiplicity import MultiplicityMap
from localcomp.figures.ratios import Curve, RatioPanel, SlopeTable
from localcomp.figures.verdicts import VerdictGrid
from localcomp.models import ActivityModel, ModelInput, Reading
from localcomp.standing import title

FINE = 121
"""Compositions of a stated curve."""
PANELS = 3
SAME_CURVE = 1e-6
LEFT_OUT = ("nrtl-0.2", "nrtl-0.47", "quasi-chemical-first-order")
"""Kept out of line figures when more models are asked for than can be told apart."""
MOST_LINES = 14


def verdict_grid(audit: Audit) -> VerdictGrid:
    """Models and readings down, claims across."""
    rows = audit.rows()
    outcomes: list[list[str | None]] = []
    strength: list[list[float | None]] = []
    for model, reading in rows:
        found = {v.test.claim: v for v in audit.of(model, reading)}
        outcomes.append([found[t.claim].outcome.value if t.claim in found else None for t in CLAIMS])
        strength.append(
            [
                found[t.claim].deviation / found[t.claim].tolerance
                if t.claim in found and np.isfinite(found[t.claim].deviation)
                else None
                for t in CLAIMS
            ]
        )
    return VerdictGrid([title(*row) for row in rows], [t.short for t in CLAIMS], outcomes, strength)


def shown_mixture(audit: Audit) -> int:
    """The mixture line figures show: the one whose ratios are furthest from one."""
    table = audit.findings.main
    size = np.abs(table.ln_ratio).mean(axis=(1, 2))
    best, found = 0, -1.0
    for number in np.unique(table.mixture):
        rows = (table.mixture == number) & np.isfinite(size)
        value = float(size[rows].mean()) if rows.any() else -1.0
        if value > found:
            best, found = int(number), value
    return best


def species_of(audit: Audit, number: int) -> tuple[str, ...]:
    """Names of the species of a mixture."""
    return audit.species(int(np.flatnonzero(audit.findings.main.mixture == number)[0]))


def describe_mixture(audit: Audit, number: int) -> str:
    """A mixture in words."""
    table = audit.findings.main
    row = int(np.flatnonzero(table.mixture == number)[0])
    labels = {k: v for k, v in table.labels[row].items() if k != "reduced_temperature"}
    words = {"size_ratio": "σ_2/σ_1", "energy_ratio": "ε_2/ε_1", "well_range": "λ", "mixture": ""}
    parts = []
    for name, value in labels.items():
        if name == "l" and value == 0.0:
            continue
        shown = f"{value:g}" if isinstance(value, float | int) else str(value)
        parts.append(f"{words.get(name, name)} = {shown}" if words.get(name, name) else shown)
    return ", ".join(parts)


def line_models(audit: Audit) -> list[tuple[ActivityModel, Reading]]:
    """Models and readings that line figures show."""
    rows = audit.rows()
    if len(rows) > MOST_LINES:
        rows = [(m, r) for m, r in rows if m.name not in LEFT_OUT]
    return rows


def merged(curves: list[tuple[str, list[Array]]]) -> list[tuple[str, list[Array]]]:
    """Curves that coincide in every panel, once, under all their names."""
    out: list[tuple[str, list[Array]]] = []
    for label, values in curves:
        for n, (names, other) in enumerate(out):
            same = all(np.allclose(a, b, rtol=SAME_CURVE, equal_nan=True) for a, b in zip(values, other, strict=True))
            if same:
                out[n] = (f"{names}; {label}", other)
                break
        else:
            out.append((label, values))
    return out


def _levels(values: Array) -> list[float]:
    """Up to three of the levels: lowest, middle, highest."""
    levels = np.unique(values)
    if len(levels) <= PANELS:
        return [float(v) for v in levels]
    return [float(levels[0]), float(levels[len(levels) // 2]), float(levels[-1])]


def _middle(values: Array) -> float:
    levels = np.unique(values)
    return float(levels[len(levels) // 2])


def _isotherm(audit: Audit, number: int, temperature: float, packing: float) -> Index:
    """States of one mixture at one temperature and packing fraction, by composition."""
    table = audit.findings.main
    rows = np.flatnonzero(
        (table.mixture == number) & np.isclose(table.temperature, temperature) & np.isclose(table.packing, packing)
        & table.solved
    )  # fmt: skip
    return np.asarray(rows[np.argsort(table.mole_fractions[rows, 0])])


def _fine(audit: Audit, row: int) -> tuple[Array, ModelInput]:
    """The conditions of a state at closely spaced compositions."""
    table = audit.findings.main
    x = np.linspace(0.0, 1.0, FINE)
    depth = np.broadcast_to(table.depth[row] / table.temperature[row], (FINE, 2, 2))
    sigma = np.broadcast_to(table.diameter[row], (FINE, 2, 2))
    core = np.diagonal(sigma, axis1=1, axis2=2)
    return x, ModelInput(depth, core, np.column_stack([x, 1.0 - x]), sigma, np.full(FINE, audit.z))


def ratio_panels(audit: Audit, number: int, uncertainty: Array) -> list[list[RatioPanel]]:
    """R_12 and R_21 of one binary mixture against composition, per temperature, at its middle packing fraction.

    Parameters
    ----------
    uncertainty : ndarray, shape (n, s, s)
        Of ln R, numerical and between closures.
    """
    table = audit.findings.main
    own = (table.mixture == number) & table.solved
    packing = _middle(table.packing[own])
    temperatures = _levels(table.temperature[own & np.isclose(table.packing, packing)])
    rows = {t: _isotherm(audit, number, t, packing) for t in temperatures}
    rows = {t: r for t, r in rows.items() if len(r)}
    curves: list[tuple[str, list[Array]]] = []
    x = np.linspace(0.0, 1.0, FINE)
    for model, reading in line_models(audit):
        values = []
        for chosen in rows.values():
            with np.errstate(over="ignore"):
                ratio = model.ratios(_fine(audit, int(chosen[0]))[1], reading)
            values += [ratio[:, 0, 1], ratio[:, 1, 0]]
        curves.append((title(model, reading), values))
    together = merged(curves)
    out: list[list[RatioPanel]] = [[], []]
    first, second = species_of(audit, number)
    for n, (temperature, chosen) in enumerate(rows.items()):
        for direction, (i, j) in enumerate(((0, 1), (1, 0))):
            out[direction].append(
                RatioPanel(
                    _temperature_text(audit, int(chosen[0]), temperature) if direction == 0 else "",
                    f"R, {second} around {first}" if direction == 0 else f"R, {first} around {second}",
                    table.mole_fractions[chosen, 0],
                    np.exp(table.ln_ratio[chosen, i, j]),
                    uncertainty[chosen, i, j],
                    [Curve(label, x, values[2 * n + direction]) for label, values in together],
                )
            )
    return out


def _temperature_text(audit: Audit, row: int, temperature: float) -> str:
    reduced = audit.findings.main.labels[row].get("reduced_temperature")
    if isinstance(reduced, float) and abs(reduced - temperature) > 1e-9:
        return f"T* = {reduced:.4g}  (kT/ε_1 = {temperature:.4g})"
    return f"T = {temperature:.5g}{audit.temperature_unit}"


def slope_table(audit: Audit) -> SlopeTable:
    """Every pair of every state, by direction, with the slopes the models claim."""
    table = audit.findings.main
    given = table.given(audit.z)
    change = table.ln_ratio - log_ratio(audit.findings.athermal)
    exchange = given.exchange
    x, y, group = [], [], []
    size = change.shape[-1]
    called = {audit.species(n) for n in range(len(table.labels))}
    species = called.pop() if len(called) == 1 else tuple(str(i + 1) for i in range(size))
    for i in range(size):
        for j in range(size):
            if i != j:
                good = np.isfinite(change[:, i, j])
                x.append(exchange[good, i, j])
                y.append(change[good, i, j])
                equal = np.isclose(table.diameter[good, i, i], table.diameter[good, j, j])
                direction = f"{species[j]} around {species[i]}"
                group += [f"{direction}, {'equal' if same else 'unequal'} sizes" for same in equal]
    claimed: dict[float, list[str]] = {}
    for model, reading in audit.rows():
        slope = _claimed_slope(model, reading, audit.z)
        if slope is not None:
            names = claimed.setdefault(round(slope, 6), [])
            names.append("random mixing" if model.name.startswith("random") else title(model, reading))
    slopes = [(",\n  ".join(dict.fromkeys(names)), slope) for slope, names in sorted(claimed.items())]
    return SlopeTable(np.concatenate(x), np.concatenate(y), group, slopes)


def _claimed_slope(model: ActivityModel, reading: Reading, z: float) -> float | None:
    """d ln R/dD of a model whose ratio is a Boltzmann factor; None for others."""

    def ln_ratio(depth: float, x: float) -> float:
        pair = np.array([[0.0, depth], [depth, 0.3 * depth]])
        ratio = model.ratios(ModelInput(pair, np.ones(2), np.array([x, 1.0 - x]), z=z), reading)
        return float(np.log(ratio[0, 1]))

    slopes = [ln_ratio(depth, x) / depth for depth, x in ((0.1, 0.5), (0.2, 0.5), (0.1, 0.1))]
    return slopes[0] if np.ptp(slopes) < 1e-9 else None


def multiplicity_panels(audit: Audit) -> list[MultiplicityMap]:
    """m_12 and m_21 over size and energy ratio at the extremes of k, the middle of the other axes; empty for a pair."""
    table = audit.findings.main
    if any("size_ratio" not in label or "energy_ratio" not in label for label in table.labels):
        return []
    size = np.array([float(label["size_ratio"]) for label in table.labels])
    energy = np.array([float(label["energy_ratio"]) for label in table.labels])
    columns, rows = np.unique(size), np.unique(energy)
    if len(columns) < 2 or len(rows) < 2:
        return []
    k = np.array([float(label["k"]) for label in table.labels])
    reduced = np.array([float(label["reduced_temperature"]) for label in table.labels])
    x1 = table.mole_fractions[:, 0]
    here = np.ones(len(size), bool)
    other = [np.array([float(label[name]) for label in table.labels]) for name in ("l", "well_range")]
    for column in (reduced, table.packing, x1, *other):
        here &= np.isclose(column, _middle(column))
    exponent = multiplicity(audit.findings)
    out = []
    for value in sorted({float(np.min(k)), float(np.max(k))}):
        for i, j in ((0, 1), (1, 0)):
            grid = np.full((len(rows), len(columns)), np.nan)
            for n, e in enumerate(rows):
                for m, s in enumerate(columns):
                    cell = exponent[here & (k == value) & (size == s) & (energy == e), i, j]
                    cell = cell[np.isfinite(cell)]
                    if cell.size:
                        grid[n, m] = cell.mean()
            out.append(MultiplicityMap(f"{audit.names[j]} around {audit.names[i]}, k = {value:g}", columns, rows, grid))
    return out


def map_conditions(audit: Audit) -> str:
    """Where the maps are cut."""
    table = audit.findings.main
    reduced = np.array([float(label["reduced_temperature"]) for label in table.labels])
    x1 = _middle(table.mole_fractions[:, 0])
    return f"T* = {_middle(reduced):.3g}, η = {_middle(table.packing):.3g}, x_1 = {x1:.2g}"


def shown_conditions(audit: Audit, number: int, *, with_temperature: bool = False) -> str:
    """Where line figures of one mixture are cut, and the closure."""
    table = audit.findings.main
    own = (table.mixture == number) & table.solved
    packing = _middle(table.packing[own])
    text = f"η = {packing:.3g}"
    if with_temperature:
        temperature = _middle(table.temperature[own & np.isclose(table.packing, packing)])
        text += f", T = {temperature:.4g}{audit.temperature_unit}"
    return text + (f", {audit.closure}" if audit.closure else "")


def left_out(audit: Audit) -> list[str]:
    """Models that were judged but are not drawn in line figures."""
    drawn = line_models(audit)
    return list(dict.fromkeys(m.label for m, r in audit.rows() if (m, r) not in drawn))


def multiplicity_curves(audit: Audit, number: int) -> list[Curve]:
    """m_12 and m_21 of one mixture against composition, at its extreme temperatures and packing fractions."""
    table = audit.findings.main
    own = (table.mixture == number) & table.solved
    names = species_of(audit, number)
    exponent = multiplicity(audit.findings)
    extremes = [sorted({float(v[own].min()), float(v[own].max())}) for v in (table.temperature, table.packing)]
    out = []
    for temperature, packing in itertools.product(*extremes):
        rows = _isotherm(audit, number, temperature, packing)
        for i, j in ((0, 1), (1, 0)):
            if np.isfinite(exponent[rows, i, j]).any():
                at = f"T = {temperature:.4g}{audit.temperature_unit}, η = {packing:.3g}"
                label = f"{names[j]} around {names[i]}, {at}"
                out.append(Curve(label, table.mole_fractions[rows, 0], exponent[rows, i, j]))
    return out


def reciprocity_curves(audit: Audit, number: int) -> tuple[list[Curve], Curve]:
    """x_1 N_12/(x_2 N_21) of every model for one binary mixture at its middle temperature, and as found."""
    table = audit.findings.main
    own = (table.mixture == number) & table.solved
    packing = _middle(table.packing[own])
    temperature = _middle(table.temperature[own & np.isclose(table.packing, packing)])
    rows = _isotherm(audit, number, temperature, packing)
    x, given = _fine(audit, int(rows[0]))
    curves = []
    for model, reading in line_models(audit):
        counts = stated_counts(model, given, reading)
        curves.append((title(model, reading), [counts[:, 0, 1] / counts[:, 1, 0]]))
    counts = table.counts[rows]
    found = Curve("found", table.mole_fractions[rows, 0], counts[:, 0, 1] / counts[:, 1, 0])
    return [Curve(_broken(label), x, values[0]) for label, values in merged(curves)], found


def _broken(label: str) -> str:
    """A long list of names on several lines."""
    return label.replace("; ", ";\n  ") if len(label) > 40 else label


def ln_ratio_uncertainty(audit: Audit, others: Sequence[Array]) -> Array:
    """Numerical error of ln R plus its largest change between closures, shape (n, s, s)."""
    table = audit.findings.main
    gap = np.zeros_like(table.counts)
    for other in others:
        gap = np.fmax(gap, np.abs(other - table.ln_ratio))
    return np.asarray(table.ln_error + gap)
