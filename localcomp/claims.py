"""The ten claims that activity models make about neighbours, each with what is measured and a tolerance.

A claim measures numbers on `Findings`. What a model claims is the same measurement on findings made by
the model; so measured and claimed quantities can never be of a different kind.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from localcomp.evidence import Array, Findings, Index, Table, log_ratio
from localcomp.models import Claim


@dataclass(frozen=True)
class Items:
    """Numbers of one claim over a class, one per state and pair (or centre).

    Attributes
    ----------
    values : ndarray, shape (k,)
        NaN where there is none.
    error : ndarray, shape (k,)
        Numerical error.
    row : ndarray of int, shape (k,)
        State, in the table the claim looks at.
    center, neighbor : ndarray of int, shape (k,)
    """

    values: Array
    error: Array
    row: Index
    center: Index
    neighbor: Index


@dataclass(frozen=True)
class ClaimTest:
    """One claim and how it is tested.

    Attributes
    ----------
    claim : Claim
    key : str
        Name of its tolerance in study files.
    short, sentence : str
        A word for tables; the claim in words.
    quantity : str
        What is measured.
    tolerance : float
        Default: largest difference between measured and claimed that still counts as holding.
    why : str
        Reason for the default.
    missing : str
        What to say when the class has nothing to test it on.
    measure : callable
        Findings -> Items.
    on_ternaries : bool
        Whether rows count ternary states.
    """

    claim: Claim
    key: str
    short: str
    sentence: str
    quantity: str
    tolerance: float
    why: str
    missing: str
    measure: Callable[[Findings], Items]
    on_ternaries: bool = False


def _items(values: Array, error: Array, pairs: list[tuple[int, int]]) -> Items:
    """Numbers of tables (n, s, s) at the given pairs."""
    rows = np.arange(values.shape[0])
    picked = [(values[:, i, j], np.broadcast_to(error, values.shape)[:, i, j], rows, i, j) for i, j in pairs]
    return Items(
        np.concatenate([p[0] for p in picked] or [np.zeros(0)]),
        np.concatenate([p[1] for p in picked] or [np.zeros(0)]),
        np.concatenate([p[2] for p in picked] or [rows[:0]]),
        np.repeat([p[3] for p in picked], len(rows)).astype(int),
        np.repeat([p[4] for p in picked], len(rows)).astype(int),
    )


def _unlike(size: int) -> list[tuple[int, int]]:
    return [(i, j) for i in range(size) for j in range(size) if i != j]


def _once(size: int) -> list[tuple[int, int]]:
    return [(i, j) for i in range(size) for j in range(i + 1, size)]


def from_middle(values: Array, group: Index) -> Array:
    """Distance from the middle of each group's range; NaN in groups with fewer than two numbers."""
    out = np.full_like(values, np.nan)
    order = np.argsort(group, kind="stable")
    for members in np.split(order, np.flatnonzero(np.diff(group[order])) + 1):
        part = values[members]
        if part.shape[0] < 2:
            continue
        high = np.max(np.where(np.isnan(part), -np.inf, part), axis=0)
        low = np.min(np.where(np.isnan(part), np.inf, part), axis=0)
        several = np.isfinite(part).sum(axis=0) > 1
        with np.errstate(invalid="ignore"):
            middle = np.where(several, 0.5 * (high + low), np.nan)
        out[members] = part - middle
    return out


def _spread(table: Table, group: Index) -> Items:
    return _items(from_middle(table.ln_ratio, group), 2.0 * table.ln_error, _unlike(table.counts.shape[-1]))


def composition(findings: Findings) -> Items:
    """ln R_ij minus the middle of its range over composition at the same temperature and density."""
    table = findings.main
    return _spread(table, table.groups(table.temperature, table.packing))


def density(findings: Findings) -> Items:
    """ln R_ij minus the middle of its range over packing fraction at the same temperature and composition."""
    table = findings.main
    return _spread(table, table.groups(table.temperature, table.mole_fractions))


def boltzmann(findings: Findings) -> Items:
    """ln R_ij - ln R_ij(athermal)."""
    table = findings.main
    change = table.ln_ratio - log_ratio(findings.athermal)
    change = np.where(
        np.any(table.depth != 0.0, axis=(1, 2), keepdims=True), change, np.nan
    )  # hard spheres test nothing
    return _items(change, 2.0 * table.ln_error, _unlike(change.shape[-1]))


def athermal_limit(findings: Findings) -> Items:
    """ln R_ij(athermal)."""
    table = findings.main
    error = table.ln_error
    if np.isfinite(error).any():  # states without a solution often have one without wells: the worst error known
        error = np.where(np.isfinite(error), error, np.nanmax(error))
    return _items(log_ratio(findings.athermal), error, _unlike(table.counts.shape[-1]))


def product(findings: Findings) -> Items:
    """ln(R_ij R_ji)."""
    table = findings.main
    ratio = table.ln_ratio
    error = table.ln_error
    swapped = (0, 2, 1)
    return _items(
        ratio + ratio.transpose(swapped), error + error.transpose(swapped), _once(table.counts.shape[-1])
    )  # fmt: skip


def reciprocity(findings: Findings) -> Items:
    """ln[x_i N_ij/(x_j N_ji)]."""
    table = findings.main
    with np.errstate(divide="ignore", invalid="ignore"):
        value = np.log(table.counts / table.counts.transpose(0, 2, 1))
    value = np.where(np.isfinite(value), value, np.nan)
    return _items(value, np.zeros_like(value), _once(table.counts.shape[-1]))  # one integral, counted from both ends


def coordination(findings: Findings) -> Items:
    """ln sum_j N_ij of each centre, minus the middle of its range over the class."""
    table = findings.main
    total = (table.counts * table.mole_fractions[:, None, :]).sum(axis=-1)
    with np.errstate(divide="ignore", invalid="ignore"):
        ln_total = np.log(total)
    if np.isfinite(ln_total).any():
        ln_total = ln_total - 0.5 * (np.nanmax(ln_total) + np.nanmin(ln_total))
    size = total.shape[-1]
    rows = np.tile(np.arange(total.shape[0]), size)
    centers = np.repeat(np.arange(size), total.shape[0])
    return Items(ln_total.T.ravel(), 2.0 * table.error.max(axis=-1).T.ravel(), rows, centers, centers)


def ternary(findings: Findings) -> Items:
    """ln R_ij in the mixture of three or more minus ln R_ij in the pair alone."""
    if findings.ternary is None or findings.binary is None:
        return _items(np.zeros((0, 2, 2)), np.zeros((0, 2, 2)), [])
    table = findings.ternary
    change = table.ln_ratio - findings.binary
    return _items(change, 2.0 * table.ln_error, _unlike(change.shape[-1]))


def energy(findings: Findings) -> Items:
    """Energy per contact, sum x_i N_ij eps_ij / sum x_i N_ij, over the class's own sum x_i x_j |eps_ij|."""
    table = findings.main
    x = table.mole_fractions
    pairs = x[:, :, None] * x[:, None, :]
    weight = pairs * table.well_counts
    scale = (pairs * np.abs(table.depth)).sum(axis=(1, 2))
    with np.errstate(divide="ignore", invalid="ignore"):
        value = (weight * table.depth).sum(axis=(1, 2)) / weight.sum(axis=(1, 2)) / scale
    mixed = (x > 0.0).sum(axis=1) > 1  # a pure liquid has one energy only
    value = np.where(np.isfinite(value) & mixed, value, np.nan)
    rows = np.arange(len(value))
    none = np.full(len(value), -1)
    return Items(value, table.error.max(axis=(1, 2)), rows, none, none)


def shell_rule(findings: Findings) -> Items:
    """ln R_ij under another shell rule minus ln R_ij under the study's."""
    table = findings.main
    parts = [
        _items(log_ratio(counts) - table.ln_ratio, 2.0 * table.ln_error, _unlike(counts.shape[-1]))
        for counts in findings.rules.values()
    ]
    if not parts:
        return _items(np.zeros((0, 2, 2)), np.zeros((0, 2, 2)), [])
    return Items(*(np.concatenate([getattr(p, f) for p in parts]) for f in Items.__dataclass_fields__))


RATIO_REASON = (
    "a ratio off by 5 % moves ln gamma at infinite dilution by about 0.05, what careful measurements of it scatter by"
)
CLAIMS: tuple[ClaimTest, ...] = (
    ClaimTest(
        Claim.COMPOSITION_FREE, "composition", "composition", "R does not depend on composition",
        "ln R, distance from the middle of its range over composition", 0.05, RATIO_REASON,
        "the study has one composition only", composition,
    ),
    ClaimTest(
        Claim.BOLTZMANN, "boltzmann", "Boltzmann", "attraction changes ln R by m beta (eps_ij - eps_ii)",
        "ln R - ln R(athermal)", 0.05, RATIO_REASON, "no state with attraction has a solution", boltzmann,
    ),
    ClaimTest(
        Claim.ATHERMAL_LIMIT, "athermal", "athermal", "without attraction R is set by mole, surface or volume",
        "ln R(athermal)", 0.05, RATIO_REASON, "no state has an athermal counterpart", athermal_limit,
    ),
    ClaimTest(
        Claim.PRODUCT, "product", "product", "R_ij R_ji is the stated function of the energies alone",
        "ln(R_ij R_ji)", 0.10, "two ratios, each with its 5 %", "no state has two species", product,
    ),
    ClaimTest(
        Claim.RECIPROCITY, "reciprocity", "reciprocity", "pairs counted from both ends agree as the model implies",
        "ln[x_i N_ij/(x_j N_ji)]", 0.05, "real pairs agree exactly; 5 % is what a ratio may be off by",
        "no state has two species", reciprocity,
    ),
    ClaimTest(
        Claim.DENSITY_FREE, "density", "density", "R does not depend on density",
        "ln R, distance from the middle of its range over packing fraction", 0.05, RATIO_REASON,
        "the study has one packing fraction only", density,
    ),
    ClaimTest(
        Claim.CONSTANT_COORDINATION, "coordination", "coordination", "a molecule has a constant number of neighbours",
        "ln N_i, distance from the middle of its range over the class", 0.10,
        "in practice z is taken as 8 to 12 and known no better than 10 % either way",
        "no state has a solution", coordination,
    ),
    ClaimTest(
        Claim.TERNARY, "ternary", "ternary", "ratios in a ternary are those of its binaries",
        "ln R(ternary) - ln R(binary)", 0.05, RATIO_REASON,
        "the study has one pair, or pairs without a class: no mixture of three species is made of them",
        ternary, on_ternaries=True,
    ),
    ClaimTest(
        Claim.ENERGY, "energy", "energy", "the energy of the stated neighbours is the energy",
        "energy per contact over sum x_i x_j |eps_ij|", 0.01,
        "excess energies of simple liquids are a few per cent of the energy: 1 % is a quarter or so of them",
        "no mixed state with attraction has a solution", energy,
    ),
    ClaimTest(
        Claim.SHELL_RULE, "shell_rule", "shell rule", "the answer does not hinge on the shell rule",
        "ln R(other rule) - ln R", 0.05, RATIO_REASON, "no other shell rule has an answer", shell_rule,
    ),
)  # fmt: skip
TOLERANCE_KEYS = tuple(test.key for test in CLAIMS)
