"""What the models' papers say about neighbours, written out pair by pair and sharing no code with the models.

R_ij = (N_ij/N_ii)/(x_j/x_i) and contacts of a centre over z, for one state. Sources: Wilson 1964; Renon and Prausnitz
1968; Abrams and Prausnitz 1975; Vera, Sayegh and Ratcliff 1977 (recalled); Guggenheim, Mixtures, 1952, chapters 4 and
10; random mixing by definition.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from localcomp.evidence import Findings, Table
from localcomp.models import ActivityModel, Reading

Matrix = Sequence[Sequence[float]]


def ratio(name: str, m: float, beta_eps: Matrix, sigma: Sequence[float], x: Sequence[float], i: int, j: int) -> float:
    """R_ij as the model of that name states it."""
    d = m * (beta_eps[i][j] - beta_eps[i][i])
    q = [s * s for s in sigma]
    if name == "random-mole":
        return 1.0
    if name == "random-surface":
        return q[j] / q[i]
    if name == "random-volume":
        return (sigma[j] / sigma[i]) ** 3
    if name == "random-pair-volume":
        return ((sigma[i] + sigma[j]) / 2.0 / sigma[i]) ** 3
    if name == "wilson":
        return math.exp(d)
    if name.startswith("nrtl-"):
        return math.exp(float(name.split("-")[1]) * d)
    if name in ("uniquac", "lsg"):
        return q[j] / q[i] * math.exp(d)
    total = sum(qk * xk for qk, xk in zip(q, x, strict=True))
    theta = [qk * xk / total for qk, xk in zip(q, x, strict=True)]
    w = [[m * (beta_eps[a][b] - (beta_eps[a][a] + beta_eps[b][b]) / 2.0) for b in range(len(x))] for a in range(len(x))]
    if name == "quasi-chemical":
        g = equilibrium(theta, w)
        return q[j] * g[j] / (q[i] * g[i]) * math.exp(w[i][j])
    mean = [sum(theta[b] * w[a][b] for b in range(len(x))) for a in range(len(x))]
    whole = sum(theta[a] * mean[a] for a in range(len(x)))
    change = [whole / 2.0 - mean[a] for a in range(len(x))]
    return q[j] / q[i] * (1.0 + change[i] + change[j] + w[i][j]) / (1.0 + 2.0 * change[i])


def equilibrium(theta: Sequence[float], w: Matrix) -> list[float]:
    """g with g_i sum_j theta_j g_j exp(w_ij) = 1, by damped repetition."""
    g = [1.0] * len(theta)
    for _ in range(4000):
        new = [1.0 / sum(t * gj * math.exp(wij) for t, gj, wij in zip(theta, g, row, strict=True)) for row in w]
        change = max(abs(a / b - 1.0) for a, b in zip(new, g, strict=True))
        g = [math.sqrt(a * b) for a, b in zip(new, g, strict=True)]
        if change < 1e-14:
            break
    return g


def contacts(name: str, sigma: Sequence[float], x: Sequence[float], segment: float) -> list[float]:
    """Neighbours of a centre over z."""
    if name in ("random-mole", "wilson") or name.startswith("nrtl"):
        return [1.0] * len(x)
    if name == "random-volume":
        return [(s / segment) ** 3 for s in sigma]
    if name == "random-pair-volume":
        volume = sum(xk * s**3 for xk, s in zip(x, sigma, strict=True))
        return [sum(xk * ((s + own) / 2.0) ** 3 for xk, s in zip(x, sigma, strict=True)) / volume for own in sigma]
    return [(s / segment) ** 2 for s in sigma]


def counts(
    name: str, m: float, z: float, beta_eps: Matrix, sigma: Sequence[float], x: Sequence[float], segment: float
) -> np.ndarray:
    """N_ij/x_j, shape (s, s)."""
    size = range(len(x))
    around = contacts(name, sigma, x, segment)
    r = [[ratio(name, m, beta_eps, sigma, x, i, j) for j in size] for i in size]
    return np.array([[z * around[i] * r[i][j] / sum(x[k] * r[i][k] for k in size) for j in size] for i in size])


def written_out(findings: Findings, model: ActivityModel, reading: Reading, z: float) -> Findings:
    """The states of `findings` with a model's neighbours from the formulas above."""
    m = 1.0 if reading is Reading.ONE_CONTACT else z / 2.0

    def made(table: Table, heat: float, pair: tuple[int, int] | None = None) -> np.ndarray:
        segment = float(table.diameter.min())
        out = []
        for n in range(len(table.temperature)):
            species = list(range(table.mole_fractions.shape[1])) if pair is None else list(pair)
            x = table.mole_fractions[n][species]
            depth = heat * table.depth[n][np.ix_(species, species)] / table.temperature[n]
            sigma = np.diag(table.diameter[n])[species]
            out.append(counts(model.name, m, z, depth.tolist(), sigma.tolist(), (x / x.sum()).tolist(), segment))
        return np.array(out)

    def filled(table: Table) -> Table:
        numbers = made(table, 1.0)
        return replace(table, counts=numbers, well_counts=numbers, error=np.zeros_like(numbers))

    main = filled(findings.main)
    assert findings.ternary is not None
    ternary = filled(findings.ternary)
    binary = np.zeros_like(ternary.counts)
    for i in range(3):
        for j in range(i + 1, 3):
            pair = made(ternary, 1.0, (i, j))
            binary[:, i, j] = np.log(pair[:, 0, 1] / pair[:, 0, 0])
            binary[:, j, i] = np.log(pair[:, 1, 0] / pair[:, 1, 1])
    return Findings(main, made(main, 0.0), dict.fromkeys(findings.rules, main.counts), ternary, binary)


def noisy(findings: Findings, noise: float, rng: np.random.Generator) -> Findings:
    """Every count with an independent relative error."""

    def shaken(values: np.ndarray) -> np.ndarray:
        return values * (1.0 + noise * rng.standard_normal(values.shape))

    def table(of: Table) -> Table:
        numbers = shaken(of.counts)
        return replace(of, counts=numbers, well_counts=numbers)

    assert findings.ternary is not None
    assert findings.binary is not None
    off = noise * math.sqrt(2.0) * rng.standard_normal(findings.binary.shape) * (1.0 - np.eye(3))
    return Findings(
        table(findings.main), shaken(findings.athermal), {name: shaken(v) for name, v in findings.rules.items()},
        table(findings.ternary), findings.binary + off,
    )  # fmt: skip
