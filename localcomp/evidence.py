"""What is known about the neighbours of a class: the numbers an audit judges, found or made by a model.

Everything is kept as counts per mole fraction, N_ij/x_j, which exist at infinite dilution too.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from localcomp.models import ActivityModel, ModelInput, Reading

Array = NDArray[np.float64]
Index = NDArray[np.int_]

SAME = 10
"""Decimals to which temperatures, packing and mole fractions count as the same."""


@dataclass(frozen=True)
class Table:
    """States with the same number of species; states without a solution are NaN.

    Attributes
    ----------
    mixture : ndarray of int, shape (n,)
        Which mixture of the class.
    mole_fractions : ndarray, shape (n, s)
    temperature, packing : ndarray, shape (n,)
        kT in the energy unit; eta.
    depth, diameter : ndarray, shape (n, s, s)
        eps_ij and sigma_ij.
    counts : ndarray, shape (n, s, s)
        N_ij/x_j under the shell rule.
    well_counts : ndarray, shape (n, s, s)
        N_ij/x_j inside the well, which carries the energy.
    error : ndarray, shape (n, s, s)
        Relative numerical error of counts.
    labels : tuple of dict
        What the study calls the state.
    names : tuple of tuple of str
        Species of each state; empty: known by their number.
    """

    mixture: Index
    mole_fractions: Array
    temperature: Array
    packing: Array
    depth: Array
    diameter: Array
    counts: Array
    well_counts: Array
    error: Array
    labels: tuple[dict[str, Any], ...]
    names: tuple[tuple[str, ...], ...] = ()

    def species(self, row: int, default: tuple[str, ...] = ()) -> tuple[str, ...]:
        """Names of the species of one state."""
        size = self.mole_fractions.shape[1]
        if self.names:
            return self.names[row]
        return default if len(default) == size else tuple(str(i + 1) for i in range(size))

    @property
    def ln_ratio(self) -> Array:
        """ln R_ij, shape (n, s, s)."""
        return log_ratio(self.counts)

    @property
    def ln_error(self) -> Array:
        """Numerical error of ln R_ij, shape (n, s, s)."""
        own = np.diagonal(self.error, axis1=1, axis2=2)
        return self.error + own[:, :, None]

    @property
    def solved(self) -> NDArray[np.bool_]:
        """Which states have numbers, shape (n,)."""
        return np.asarray(np.isfinite(self.counts).all(axis=(1, 2)))

    def given(self, z: float) -> ModelInput:
        """What a model is told about these states; one segment for the whole table, its smallest sphere."""
        return ModelInput(
            self.depth / self.temperature[:, None, None],
            np.diagonal(self.diameter, axis1=1, axis2=2),
            self.mole_fractions,
            self.diameter,
            np.full(len(self.temperature), z),
            float(self.diameter.min()) if self.diameter.size else None,
        )

    def groups(self, *columns: Array) -> Index:
        """A number per state, the same where the mixture and the columns are the same."""
        keys = np.column_stack([self.mixture, *(np.round(c, SAME) for c in columns)])
        return np.asarray(np.unique(keys, axis=0, return_inverse=True)[1]).ravel()

    def subset(self, rows: Sequence[int] | Index) -> Table:
        """Some of the states."""
        picked = {
            name: getattr(self, name)[rows]
            for name in (
                "mixture", "mole_fractions", "temperature", "packing", "depth", "diameter", "counts", "well_counts",
                "error",
            )
        }  # fmt: skip
        names = tuple(self.names[int(n)] for n in rows) if self.names else ()
        return Table(**picked, labels=tuple(self.labels[int(n)] for n in rows), names=names)


@dataclass(frozen=True)
class Findings:
    """All that an audit needs about one class, from one source.

    Attributes
    ----------
    main : Table
        The states of the study.
    athermal : ndarray, shape (n, s, s)
        N_ij/x_j of the same states without wells.
    rules : dict of ndarray, shape (n, s, s)
        N_ij/x_j under other shell rules, by their description.
    ternary : Table or None
        Mixtures of three or more species of the class.
    binary : ndarray, shape (t, s, s), or None
        ln R_ij of each of their pairs alone, at the same x_i/x_j, temperature and packing fraction.
    """

    main: Table
    athermal: Array
    rules: dict[str, Array]
    ternary: Table | None = None
    binary: Array | None = None


def log_ratio(counts: Array) -> Array:
    """ln R_ij from counts per mole fraction; NaN where a shell is empty."""
    own = np.diagonal(counts, axis1=-2, axis2=-1)
    with np.errstate(divide="ignore", invalid="ignore"):
        found = np.log(counts / own[..., :, None])
    return np.asarray(np.where(np.isfinite(found), found, np.nan))


def stated_counts(model: ActivityModel, given: ModelInput, reading: Reading) -> Array:
    """N_ij/x_j = z c_i R_ij/sum_k x_k R_ik as the model states it, shape (..., s, s)."""
    with np.errstate(over="ignore", invalid="ignore"):
        ratio = model.ratios(given, reading)
        total = (given.mole_fractions[..., None, :] * ratio).sum(axis=-1)
        contacts = np.asarray(given.z)[..., None] * model.center_contacts(given)
        return np.asarray((contacts / total)[..., :, None] * ratio)


def planted(
    findings: Findings, model: ActivityModel, reading: Reading, z: float, noise: float = 0.0,
    rng: np.random.Generator | None = None,
) -> Findings:  # fmt: skip
    """The same states with neighbours made by a model: what it claims, or a truth to be recognised.

    Parameters
    ----------
    noise : float
        Relative standard deviation put on every count, independently.
    rng : numpy.random.Generator, optional
        Needed for noise.
    """

    def counts(given: ModelInput) -> Array:
        made = stated_counts(model, given, reading)
        if noise and rng is not None:
            made = made * (1.0 + noise * rng.standard_normal(made.shape))
        return made

    def remade(table: Table) -> Table:
        made = counts(table.given(z))
        return replace(table, counts=made, well_counts=made, error=np.zeros_like(made))

    given = findings.main.given(z)
    main = remade(findings.main)
    ternary = None if findings.ternary is None else remade(findings.ternary)
    binary = None
    if findings.ternary is not None:
        binary = np.zeros_like(findings.ternary.counts)
        for i, j, pair in pair_inputs(findings.ternary.given(z)):
            ratio = log_ratio(counts(pair))
            binary[:, i, j], binary[:, j, i] = ratio[:, 0, 1], ratio[:, 1, 0]
    return Findings(
        main, counts(given.athermal()), {name: counts(given) for name in findings.rules} if noise else
        dict.fromkeys(findings.rules, main.counts), ternary, binary,
    )  # fmt: skip


def pair_inputs(given: ModelInput) -> list[tuple[int, int, ModelInput]]:
    """Each pair i < j of a mixture alone, with its mole fractions in the same proportion."""
    out = []
    size = given.mole_fractions.shape[-1]
    for i in range(size):
        for j in range(i + 1, size):
            both = [i, j]
            x = given.mole_fractions[..., both]
            out.append(
                (
                    i,
                    j,
                    ModelInput(
                        given.reduced_depth[..., both, :][..., both],
                        given.diameter[..., both],
                        x / x.sum(axis=-1, keepdims=True),
                        None if given.pair_diameter is None else given.pair_diameter[..., both, :][..., both],
                        given.z,
                        given.segment,
                    ),
                )
            )
    return out
