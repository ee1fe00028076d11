"""One closure's integral equation on one grid, written as a fixed point of x = r gamma(r).

    c(r) = sum of segment weights * g(gamma) - 1 - gamma      (core weight: g = 0)
    c(k), gamma(k) by `transform` and `oz`; back to r gamma(r)
All arrays carry a batch of states in front. Lengths are in the smallest diameter of each state,
densities in its inverse cube, energies in kT.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from ozsolve.closures import BoundClosure, Closure
from ozsolve.grid import Grid, indicators
from ozsolve.oz import eigenvalues_above, indirect, indirect_response, pair_positions
from ozsolve.potential import Array, Flags, Indices
from ozsolve.transform import plan


@dataclass(frozen=True)
class Fluid:
    """A batch of states in reduced units.

    Attributes
    ----------
    rho : ndarray, shape (b, s)
    core, edge : ndarray, shape (b, pairs)
        sigma_ij and lam_ij sigma_ij for i <= j.
    attraction : ndarray, shape (b, pairs)
        beta eps_ij.
    """

    rho: Array
    core: Array
    edge: Array
    attraction: Array

    def scaled(self, *, attraction: float = 1.0, density: float = 1.0) -> Fluid:
        """The same with all depths or densities multiplied."""
        return Fluid(self.rho * density, self.core, self.edge, self.attraction * attraction)


class Equations:
    """The fixed-point map G of one closure for a batch of states on one grid.

    Parameters
    ----------
    fluid : Fluid
    grid : Grid
    closure : Closure
    bridge : ndarray, shape (b, pairs, points - 1), optional
        Bridge function of the reference; needed when the closure asks for it.
    """

    def __init__(self, fluid: Fluid, grid: Grid, closure: Closure, bridge: Array | None = None) -> None:
        self.fluid = fluid
        self.grid = grid
        self.closure = closure
        self.root_rho = np.sqrt(fluid.rho)
        inside_core = self._indicator(fluid.core)
        inside_edge = self._indicator(fluid.edge)
        self.well = inside_edge - inside_core
        self.outside = 1.0 - inside_edge
        self.bridge = np.zeros((1, 1, 1)) if bridge is None else bridge
        self._finish()

    def _finish(self) -> None:
        """What follows from fluid, grid, closure, weights and bridge."""
        fluid, grid, closure = self.fluid, self.grid, self.closure
        batch, pairs = fluid.core.shape
        self.shape = (batch, pairs, grid.points - 1)
        self.transform = plan(grid.spacing, grid.points, batch * pairs)
        self.bound: BoundClosure = closure.bind(
            fluid.attraction[:, :, None], self.bridge, self.well * grid.r, self.outside * grid.r
        )
        self._inverse_r = 1.0 / grid.r
        self._input = self.transform.input.reshape(self.shape)

    def take(self, rows: Indices) -> Equations:
        """The same equations for some states of the batch (integer index)."""
        fluid = self.fluid
        part = object.__new__(Equations)
        part.fluid = Fluid(fluid.rho[rows], fluid.core[rows], fluid.edge[rows], fluid.attraction[rows])
        part.grid, part.closure = self.grid, self.closure
        part.root_rho = self.root_rho[rows]
        part.well, part.outside = self.well[rows], self.outside[rows]
        part.bridge = self.bridge if len(self.bridge) == 1 else self.bridge[rows]
        part._finish()
        return part

    def _indicator(self, edges: Array) -> Array:
        grid = self.grid
        return indicators(tuple(edges.ravel().tolist()), grid.spacing, grid.points).reshape(*edges.shape, -1)

    def gamma(self, x: Array) -> Array:
        """gamma(r), shape (b, pairs, m), from x = r gamma."""
        return np.asarray(np.multiply(x.reshape(self.shape), self._inverse_r))

    def pair_table(self, pairs: Array) -> Array:
        """Symmetric (..., s, s) tables from values (..., pairs), i <= j."""
        return np.asarray(pairs[..., pair_positions(self.fluid.rho.shape[-1])])

    def direct_r(self, x: Array) -> Array:
        """r times the segment-weighted c(r), shape (b, pairs, m)."""
        x = x.reshape(self.shape)
        return self.bound.value(x * self._inverse_r) - x - self.grid.r

    def direct_k(self, x: Array) -> Array:
        """c(k), shape (b, pairs, m)."""
        x = x.reshape(self.shape)
        rc_r = self.bound.value(x * self._inverse_r)
        rc_r -= x
        np.subtract(rc_r, self.grid.r, out=self._input)
        return self.transform.forward().reshape(self.shape)

    def direct_zero(self, x: Array) -> Array:
        """c(k = 0) = 4 pi int c r^2 dr, shape (b, pairs)."""
        return np.asarray(4.0 * math.pi * self.grid.spacing * (self.direct_r(x) @ self.grid.r))

    def direct_from_zero(self, x: Array) -> Array:
        """c(k) with k = 0 in front, shape (b, pairs, m + 1).

        Stability is lost at k = 0 first, which the sine transform's own points leave out.
        """
        rc_r = self.direct_r(x)
        zero = 4.0 * math.pi * self.grid.spacing * (rc_r @ self.grid.r)
        self._input[:] = rc_r
        return np.concatenate((zero[:, :, None], self.transform.forward().reshape(self.shape)), axis=-1)

    def definite(self, x: Array) -> Flags:
        """Whether I - C(k) is positive definite at every k, zero included; shape (b,)."""
        return eigenvalues_above(self.direct_from_zero(x), self.root_rho, 0.0)

    def apply(self, x: Array) -> tuple[Array, list[Array]]:
        """G(x), same shape as x, and the pivots of I - C(k) (see `oz.smallest_pivot`)."""
        gamma_k, pivots = indirect(self.direct_k(x), self.root_rho)
        return self._inverse(gamma_k).reshape(x.shape), pivots

    def derivative(self, x: Array) -> Callable[[Array], Array]:
        """The linear map v -> G'(x) v."""
        c_k = self.direct_k(x)
        gamma_k, _ = indirect(c_k, self.root_rho)
        h_k = c_k + gamma_k
        slope = self.bound.slope(self.gamma(x)) * self._inverse_r - 1.0
        rho = self.fluid.rho

        def product(v: Array) -> Array:
            np.multiply(slope, v.reshape(self.shape), out=self._input)
            dc_k = self.transform.forward().reshape(self.shape)
            return self._inverse(indirect_response(h_k, rho, dc_k)).reshape(v.shape)

        return product

    def _inverse(self, f_k: Array) -> Array:
        rows = self.shape[0] * self.shape[1]
        return self.transform.inverse(f_k.reshape(rows, -1)).reshape(self.shape)


def regrid(x: Array, pairs: int, old: Grid, new: Grid) -> Array:
    """x = r gamma moved to another grid; shape (b, pairs*(points - 1)) of the new one.

    Same extent: by padding or cutting in k space. Same spacing: by padding or cutting in r space.

    Raises
    ------
    ValueError
        If both the spacing and the extent change: do one after the other.
    """
    batch = x.shape[0]
    rows = x.reshape(batch * pairs, old.points - 1)
    keep = min(old.points, new.points) - 1
    if abs(old.spacing / new.spacing - 1.0) < 1e-12:
        out = np.zeros((len(rows), new.points - 1))
        out[:, :keep] = rows[:, :keep]
    elif abs(old.extent / new.extent - 1.0) < 1e-12:
        f_k = plan(old.spacing, old.points, len(rows)).forward(rows)
        padded = np.zeros((len(rows), new.points - 1))
        padded[:, :keep] = f_k[:, :keep]
        out = plan(new.spacing, new.points, len(rows)).inverse(padded)
    else:
        raise ValueError("change the spacing or the extent, not both at once")
    return out.reshape(batch, -1)
