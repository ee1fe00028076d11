"""Numbers read off a solution: shell integrals, contact values, energy, pressure, k = 0 limits.

Pair arrays have shape (s, s). Everything here is in reduced units: lengths in the smallest diameter,
energies in kT. `Observables` is what one grid gives; the solver makes error bars from two of them.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from ozsolve.equations import Equations
from ozsolve.grid import edge_interpolation, step_weights
from ozsolve.oz import unpack
from ozsolve.potential import Array


@dataclass(frozen=True)
class Observables:
    """What one grid gives for one state.

    Attributes
    ----------
    shell_integral : ndarray, shape (s, s)
        K_ij = 4 pi int_0^edge g_ij r^2 dr; N_ij = rho_j K_ij.
    contact, inner_edge, outer_edge : ndarray, shape (s, s)
        g at sigma_ij+, at the well edge from inside, from outside.
    c_zero, h_zero : ndarray, shape (s, s)
        Transforms at k = 0; `h_zero` are the Kirkwood-Buff integrals.
    energy : float
        U/(N kT).
    virial : float
        Z = beta P/rho by the virial route.
    inverse_compressibility : float
        1/(rho kT kappa_T) by the compressibility route.
    """

    shell_integral: Array
    contact: Array
    inner_edge: Array
    outer_edge: Array
    c_zero: Array
    h_zero: Array
    energy: float
    virial: float
    inverse_compressibility: float

    @classmethod
    def missing(cls, species: int) -> Observables:
        """All NaN: a failed solve gives no numbers."""
        nan = np.full((species, species), np.nan)
        return cls(nan, nan, nan, nan, nan, nan, math.nan, math.nan, math.nan)

    def scales(self) -> dict[str, Array | float]:
        """The size against which a difference in each number is judged."""
        return {
            "shell_integral": np.abs(self.shell_integral),
            "contact": np.maximum(np.abs(self.contact), 0.1),
            "inner_edge": np.maximum(np.abs(self.inner_edge), 0.1),
            "outer_edge": np.maximum(np.abs(self.outer_edge), 0.1),
            "c_zero": np.full_like(self.c_zero, np.abs(self.c_zero).max()),
            "h_zero": np.full_like(self.h_zero, np.abs(self.h_zero).max()),
            "energy": abs(self.energy),
            "virial": 1.0 + abs(self.virial),
            "inverse_compressibility": 1.0 + abs(self.inverse_compressibility),
        }

    def roughness(self, rough: Observables) -> float:
        """How far a second grid is off, in units of a typical error of a coordination number.

        Every number is judged against its usual sensitivity (`SENSITIVITY`) and the worst one counts,
        so that a difference that happens to vanish in one number does not shrink its error bar.
        """
        scales = self.scales()
        worst = 0.0
        for name, usual in SENSITIVITY.items():
            difference = np.abs(np.asarray(getattr(self, name)) - np.asarray(getattr(rough, name)))
            scale = np.asarray(scales[name])
            relative = np.divide(difference, scale, out=np.zeros_like(difference), where=scale > 0.0)
            worst = max(worst, float(relative.max()) / usual)
        return worst

    def bars(self, roughness: float, floor: float) -> Observables:
        """Absolute error bars from a bound on the relative error of a coordination number.

        Parameters
        ----------
        roughness : float
            That bound from the grid; multiplied by each number's usual sensitivity.
        floor : float
            What the residual and the extent add to every number.
        """
        scales = self.scales()
        out: dict[str, Array | float] = {}
        for name, scale in scales.items():
            bar = scale * (SENSITIVITY.get(name, SENSITIVITY["c_zero"]) * roughness + floor)
            out[name] = bar if isinstance(bar, np.ndarray) else float(bar)
        return Observables(**out)  # type: ignore[arg-type]


SENSITIVITY = {
    "shell_integral": 1.0,
    "contact": 12.0,
    "inner_edge": 14.0,
    "outer_edge": 14.0,
    "c_zero": 5.0,
    "energy": 0.3,
    "virial": 4.0,
    "inverse_compressibility": 2.0,
}
"""Relative grid error of each number in units of a coordination number's: medians over 400 random
liquids (two to three species, size ratio up to 2, all closures), then raised, for contact values and
the virial, until their bars covered 95 % of those states. The tests draw other states."""


def observe(equations: Equations, x: Array) -> Observables:
    """Read everything off a solution x of shape (1, size).

    Sources: energy and virial equation, Hansen and McDonald, Theory of Simple Liquids (2006), eqs.
    2.5.20 and 2.5.22, with the derivative of a stepwise potential taken at its steps; the
    compressibility equation, eq. 3.5.15 of the same book, summed over species.
    """
    fluid = equations.fluid
    rho = fluid.rho[0]
    total = float(rho.sum())
    fractions = rho / total
    table = equations.pair_table
    depth = table(fluid.attraction[0])
    core, edge = table(fluid.core[0]), table(fluid.edge[0])
    shell = table(shell_integrals(equations, x, fluid.edge[0]))
    contact, inner, outer = (table(row) for row in edge_values(equations, x))
    c_zero = table(direct_zero(equations, x))
    h_zero = np.linalg.solve(np.eye(len(rho)) - c_zero * rho, c_zero)
    weights = rho[:, None] * rho[None, :]
    energy = -0.5 * float(np.sum(fractions[:, None] * rho[None, :] * shell * depth))
    jumps = core**3 * contact - edge**3 * (inner - outer)
    virial = 1.0 + 2.0 * math.pi / (3.0 * total) * float(np.sum(weights * jumps))
    inverse = 1.0 - float(np.sum(weights * c_zero)) / total
    return Observables(shell, contact, inner, outer, c_zero, h_zero, energy, virial, inverse)


def g_segments(equations: Equations, x: Array) -> tuple[Array, Array]:
    """Smooth continuations of g inside the well and beyond it, each (pairs, m), valid on all r."""
    gamma = equations.gamma(x)
    attraction = equations.fluid.attraction[:, :, None]
    closure, bridge = equations.closure, equations.bridge
    inside = closure.g(gamma, attraction, bridge)[0]
    beyond = closure.g(gamma, np.zeros_like(attraction), bridge)[0]
    return inside, beyond


def shell_integrals(equations: Equations, x: Array, radius: Array) -> Array:
    """4 pi int_0^radius g r^2 dr per pair (i <= j); radius of shape (pairs,)."""
    grid = equations.grid
    inside, beyond = g_segments(equations, x)
    squared = 4.0 * math.pi * grid.spacing * grid.r**2
    out = np.empty(len(radius))
    for p, limit in enumerate(radius):
        core, edge = float(equations.fluid.core[0, p]), float(equations.fluid.edge[0, p])
        near = _upto(min(float(limit), edge), equations) - _upto(core, equations)
        out[p] = float(np.dot(near * inside[p], squared)) if limit > core else 0.0
        if limit > edge:
            far = _upto(float(limit), equations) - _upto(edge, equations)
            out[p] += float(np.dot(far * beyond[p], squared))
    return out


def _upto(edge: float, equations: Equations) -> Array:
    return step_weights(edge, equations.grid.spacing, equations.grid.points)


def interpolate(values: Array, edge: float, equations: Equations) -> float:
    """A smooth function sampled on the grid, at r = edge."""
    start, weights = edge_interpolation(edge, equations.grid.spacing, equations.grid.points)
    return float(values[start : start + len(weights)] @ weights)


def edge_values(equations: Equations, x: Array) -> tuple[Array, Array, Array]:
    """g at contact, inside the well edge, outside it; each (pairs,). gamma is smooth there, so it is
    interpolated and the closure applied on each side."""
    fluid, closure = equations.fluid, equations.closure
    gamma = equations.gamma(x)[0]
    bridge = np.broadcast_to(equations.bridge, equations.shape)[0]
    out = np.empty((3, len(gamma)))
    for p in range(len(gamma)):
        attraction = fluid.attraction[0, p]
        core, edge = float(fluid.core[0, p]), float(fluid.edge[0, p])
        at_core = interpolate(gamma[p], core, equations), interpolate(bridge[p], core, equations)
        at_edge = interpolate(gamma[p], edge, equations), interpolate(bridge[p], edge, equations)
        out[0, p] = closure.g(np.asarray(at_core[0]), np.asarray(attraction), np.asarray(at_core[1]))
        out[1, p] = closure.g(np.asarray(at_edge[0]), np.asarray(attraction), np.asarray(at_edge[1]))
        out[2, p] = closure.g(np.asarray(at_edge[0]), np.asarray(0.0), np.asarray(at_edge[1]))
    return out[0], out[1], out[2]


def direct_zero(equations: Equations, x: Array) -> Array:
    """c(k = 0) = 4 pi int c r^2 dr, per pair."""
    grid = equations.grid
    rc_r = equations.direct_r(x)[0]
    return np.asarray(4.0 * math.pi * grid.spacing * (rc_r @ grid.r))


def structure_factors(c_k: Array, rho: Array) -> Array:
    """Partial structure factors S_ij(k) = delta_ij + sqrt(rho_i rho_j) h_ij(k) = (I - C)^-1.

    Parameters
    ----------
    c_k : ndarray, shape (pairs, m)
    rho : ndarray, shape (s,)

    Returns
    -------
    ndarray, shape (s, s, m)
    """
    species = len(rho)
    full = np.moveaxis(unpack(c_k, species), -1, 0)
    root = np.sqrt(rho)
    matrix = np.eye(species) - root[:, None] * root[None, :] * full
    inverse: Array = np.linalg.inv(matrix).astype(np.float64, copy=False)
    return np.moveaxis(inverse, 0, -1)


def concentration_fluctuations(h_zero: Array, rho: Array) -> Array:
    """S_cc(0) as the matrix N <dx_i dx_j>, dx_i = (dN_i - x_i dN)/N; shape (s, s).

    For two species its (1, 1) entry is x1 x2 [1 + x1 x2 rho (G11 + G22 - 2 G12)], S_cc(0) of Bhatia
    and Thornton, Phys. Rev. B 2 (1970) 3004. Ideal value x1 x2; it diverges at the spinodal.
    """
    total = float(rho.sum())
    x = rho / total
    fluctuations = np.diag(x) + total * x[:, None] * x[None, :] * h_zero
    project = np.eye(len(x)) - x[:, None]
    return np.asarray(project @ fluctuations @ project.T)
