"""Numbers read off a solution: shell integrals, contact values, energy, pressure, k = 0 limits.

Pair arrays have shape (s, s). Everything here is in reduced units: lengths in the smallest diameter,
energies in kT. `Observables` is what one grid gives; the solver makes error bars from two of them.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, fields

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

    def gap(self, other: Observables) -> Observables:
        """Absolute differences, entry by entry."""
        return Observables(*(abs(getattr(self, f.name) - getattr(other, f.name)) for f in fields(self)))

    def bars(self, gap: Observables, share: float, relative: float) -> Observables:
        """Error bars: a share of the gap to a second grid plus a relative floor."""
        return Observables(
            *(share * getattr(gap, f.name) + relative * abs(getattr(self, f.name)) for f in fields(self))
        )


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
    return np.moveaxis(np.linalg.inv(matrix), 0, -1)


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
