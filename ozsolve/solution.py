"""The result of one solve: inputs, correlation functions, thermodynamics, error bars, how it went."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property

import numpy as np

from ozsolve.closures import PY, Closure
from ozsolve.continuation import Rung
from ozsolve.equations import Equations, Fluid
from ozsolve.grid import Grid
from ozsolve.mixture import Mixture, State
from ozsolve.oz import lowest_eigenvalue, unpack
from ozsolve.potential import Array
from ozsolve.response import density_derivatives, partial_energies
from ozsolve.root import bridge_function
from ozsolve.stopping import Status
from ozsolve.thermodynamics import (
    ERROR_SHARE,
    Observables,
    concentration_fluctuations,
    g_segments,
    shell_integrals,
    structure_factors,
)

NEGATIVE_G = -1e-6
"""g below this outside the core is reported as a defect of the closure."""


@dataclass(frozen=True)
class Stats:
    """What a solve cost.

    Attributes
    ----------
    steps : int
        Evaluations of the fixed-point map, all grids and rungs together.
    transforms : int
        Stacks of radial transforms.
    grid_points : int
        Of the final grid.
    spacing, extent : float
        Of the final grid, in the smallest diameter.
    rungs : tuple of Rung
        Continuation steps, in order, with their ends.
    restarts : int
        Times the accelerator threw its history away.
    seconds : float
        Wall time.
    """

    steps: int
    transforms: int
    grid_points: int
    spacing: float
    extent: float
    rungs: tuple[Rung, ...]
    restarts: int
    seconds: float


@dataclass(frozen=True)
class LevelResult:
    """One grid's fixed point: all that is needed to evaluate anything on that grid.

    Attributes
    ----------
    fluid : Fluid
        Batch of one.
    grid : Grid
    closure : Closure
    x, reference : ndarray, shape (1, size)
        r gamma of the state and of its Percus-Yevick hard-sphere reference.
    """

    fluid: Fluid
    grid: Grid
    closure: Closure
    x: Array
    reference: Array

    @cached_property
    def equations(self) -> Equations:
        """Built on first use, so that many solutions can be kept in little memory."""
        bridge = None
        if self.closure.needs_reference:
            hard = Equations(self.fluid.scaled(attraction=0.0), self.grid, PY)
            bridge = bridge_function(self.reference, hard)
        return Equations(self.fluid, self.grid, self.closure, bridge)

    @classmethod
    def of(cls, equations: Equations, x: Array, reference: Array) -> LevelResult:
        """From equations already built."""
        level = cls(equations.fluid, equations.grid, equations.closure, x, reference)
        level.__dict__["equations"] = equations
        return level


@dataclass(frozen=True, repr=False)
class Solution:
    """A solved (or failed) state. Pair arrays are (s, s) or (s, s, m), float64, read-only.

    Lengths are in the mixture's length unit, energies in its energy unit. A failed solution has NaN
    for every number; its correlation functions are those of the last good point on the path.

    Attributes
    ----------
    mixture, state, closure, accuracy :
        The inputs.
    status : Status
    message : str
        One sentence about the end; for a failure it says where the branch ended.
    branch_end_temperature : float or None
        Lowest temperature that was solved on the way, when the branch ended.
    errors : Observables
        Absolute error bars, in reduced units (see `thermodynamics`).
    relative_error : float
        Bound on the relative numerical error of a coordination number.
    residuals : tuple of float
        max |G(x) - x| of the last iteration, the starting residual first.
    stats : Stats
    """

    mixture: Mixture
    state: State
    closure: Closure
    accuracy: float
    status: Status
    message: str
    branch_end_temperature: float | None
    length: float
    observables: Observables = field(repr=False)
    errors: Observables = field(repr=False)
    fine: LevelResult = field(repr=False)
    coarse: LevelResult | None = field(repr=False)
    relative_error: float
    residuals: tuple[float, ...] = field(repr=False)
    stats: Stats = field(repr=False)

    # --- grids and correlation functions -------------------------------------------------------

    @cached_property
    def r(self) -> Array:
        """Radii, shape (m,), length unit."""
        return _frozen(self.fine.equations.grid.r * self.length)

    @cached_property
    def k(self) -> Array:
        """Wave numbers, shape (m,), inverse length unit."""
        return _frozen(self.fine.equations.grid.k / self.length)

    @cached_property
    def gamma_r(self) -> Array:
        """Indirect correlation h - c, shape (s, s, m)."""
        return self._table(self.fine.equations.gamma(self.fine.x)[0])

    @cached_property
    def g_r(self) -> Array:
        """Radial distribution functions, shape (s, s, m); exactly 0 inside the cores."""
        fluid = self.fine.equations.fluid
        inside, beyond = g_segments(self.fine.equations, self.fine.x)
        r = self.fine.equations.grid.r
        g = np.where(r < fluid.edge[0][:, None], inside, beyond)
        return self._table(np.where(r < fluid.core[0][:, None], 0.0, g))

    @cached_property
    def h_r(self) -> Array:
        """Total correlation g - 1, shape (s, s, m)."""
        return _frozen(self.g_r - 1.0)

    @cached_property
    def c_r(self) -> Array:
        """Direct correlation h - gamma, shape (s, s, m)."""
        return _frozen(self.h_r - self.gamma_r)

    @cached_property
    def c_k(self) -> Array:
        """Fourier transform of c, shape (s, s, m), cubed length unit."""
        return self._table(self._reduced_c_k * self.length**3)

    @cached_property
    def _reduced_c_k(self) -> Array:
        return np.asarray(self.fine.equations.direct_k(self.fine.x)[0])

    @cached_property
    def structure_factors(self) -> Array:
        """S_ij(k) = delta_ij + sqrt(rho_i rho_j) h_ij(k), shape (s, s, m)."""
        return _frozen(structure_factors(self._reduced_c_k, self.fine.equations.fluid.rho[0]))

    @cached_property
    def lowest_eigenvalue(self) -> float:
        """Smallest eigenvalue of I - C(k) over all k, zero included; positive on the physical branch."""
        equations = self.fine.equations
        return float(lowest_eigenvalue(equations.direct_from_zero(self.fine.x), equations.root_rho)[0])

    # --- numbers ---------------------------------------------------------------------------------

    @property
    def densities(self) -> Array:
        """Number densities rho_i, shape (s,), inverse cubed length unit."""
        return self.mixture.densities(self.state)

    @property
    def contact_values(self) -> Array:
        """g_ij(sigma_ij+), shape (s, s)."""
        return self.observables.contact

    @property
    def edge_values(self) -> tuple[Array, Array]:
        """g_ij at the well edge from inside and from outside, each (s, s)."""
        return self.observables.inner_edge, self.observables.outer_edge

    @property
    def internal_energy(self) -> float:
        """U/N in the energy unit: -1/2 sum_ij x_i N_ij eps_ij."""
        return float(self.observables.energy) * self.state.temperature

    @property
    def virial_z(self) -> float:
        """Z = P/(rho kT), virial route."""
        return float(self.observables.virial)

    @property
    def inverse_compressibility(self) -> float:
        """1/(rho kT kappa_T) = 1 - sum_ij x_i x_j rho c_ij(0), compressibility route."""
        return float(self.observables.inverse_compressibility)

    @cached_property
    def _density_derivatives(self) -> tuple[float, float]:
        if not self.status.usable:
            return float("nan"), float("nan")
        return density_derivatives(self.fine.equations, self.fine.x, self.fine.reference)

    @property
    def virial_inverse_compressibility(self) -> float:
        """1/(rho kT kappa_T) = d(rho Z)/d rho of the virial route; NaN for a failed solution."""
        return self._density_derivatives[0]

    @property
    def energy_density_slope(self) -> float:
        """d(U/N)/d ln rho at constant temperature and composition, energy unit."""
        return self._density_derivatives[1] * self.state.temperature

    @cached_property
    def partial_energies(self) -> Array:
        """(dU/dN_j) at constant temperature and volume, shape (s,), energy unit; NaN for a failed solution.

        sum_j x_j of it is U/N + d(U/N)/d ln rho. Defined for species at zero density too.
        """
        if not self.status.usable:
            return _frozen(np.full(self.mixture.species, np.nan))
        found = partial_energies(self.fine.equations, self.fine.x, self.fine.reference)
        return _frozen(found * self.state.temperature)

    @property
    def route_gap(self) -> float:
        """1/(rho kT kappa_T) of the virial route minus that of the compressibility route.

        Zero for an exact theory; its size says how far to trust pressures of this closure.
        """
        return self.virial_inverse_compressibility - self.inverse_compressibility

    @property
    def kirkwood_buff(self) -> Array:
        """G_ij = int (g_ij - 1) d3r, shape (s, s), cubed length unit."""
        return self.observables.h_zero * self.length**3

    @property
    def direct_correlation_integrals(self) -> Array:
        """c_ij(k = 0) = int c_ij d3r, shape (s, s), cubed length unit: delta_ij/rho_i - c_ij(0) is
        d(beta mu_i)/d rho_j at constant temperature. Finite at infinite dilution."""
        return _frozen(self.observables.c_zero * self.length**3)

    @property
    def concentration_structure_factor(self) -> Array:
        """S_cc(0) = N <dx_i dx_j>, shape (s, s); [0, 0] is the usual number for two species."""
        return concentration_fluctuations(self.observables.h_zero, self.fine.fluid.rho[0])

    def shell_integral(self, radius: Array) -> tuple[Array, Array]:
        """4 pi int_0^L_ij g_ij r^2 dr and its error bar, both (s, s), cubed length unit.

        Parameters
        ----------
        radius : ndarray, shape (s, s)
            L_ij in the length unit, symmetric.
        """
        unit = self.length**3
        if np.array_equal(radius, self.mixture.pairs.well_edge):  # at hand already
            return _frozen(self.observables.shell_integral * unit), _frozen(self.errors.shell_integral * unit)
        i, j = np.triu_indices(self.mixture.species)
        limit = np.asarray(radius, dtype=np.float64)[i, j] / self.length
        value = shell_integrals(self.fine.equations, self.fine.x, limit)
        if not self.status.usable:
            value = np.full_like(value, np.nan)
        bar = self.relative_error * np.abs(value)
        if self.coarse is not None:
            rough = shell_integrals(self.coarse.equations, self.coarse.x, limit)
            bar = np.maximum(bar, ERROR_SHARE * np.abs(value - rough))
        return self._table(value * unit), self._table(bar * unit)

    def running_shell_integral(self, radii: Array) -> Array:
        """The same at many radii common to all pairs, shape (s, s, len(radii)), without error bars."""
        pairs = self.fine.equations.shape[1]
        rows = [
            shell_integrals(self.fine.equations, self.fine.x, np.full(pairs, radius / self.length)) for radius in radii
        ]
        return self._table(np.array(rows).T * self.length**3)

    @cached_property
    def defects(self) -> tuple[str, ...]:
        """Sentences about unphysical features of this closure at this state; empty when there are none."""
        found = []
        if self.status.usable and self.g_r.min() < NEGATIVE_G:
            i, j, m = (int(v) for v in np.unravel_index(int(self.g_r.argmin()), self.g_r.shape))
            found.append(
                f"g_{i + 1}{j + 1}(r) is negative ({self.g_r[i, j, m]:.3g}) near r = {self.r[m]:.3g}: "
                f"a defect of the {self.closure.title} closure at this state"
            )
        return tuple(found)

    def _table(self, pairs: Array) -> Array:
        if pairs.ndim == 1:
            return _frozen(self.fine.equations.pair_table(pairs))
        return _frozen(unpack(pairs, self.mixture.species))

    def __repr__(self) -> str:
        x = ", ".join(f"{v:.4g}" for v in self.state.mole_fractions)
        lines = [
            f"Solution: {self.status.value} ({self.closure.name})",
            f"  kT = {self.state.temperature:.6g}, eta = {self.mixture.packing_fraction(self.state):.6g}, x = ({x})",
            f"  residual {self.residuals[-1] if self.residuals else float('nan'):.1e} after {self.stats.steps} steps, "
            f"{self.stats.grid_points} points of {self.stats.spacing:.4g}, {1e3 * self.stats.seconds:.1f} ms",
        ]
        if self.status.usable:
            lines.append(
                f"  U/N = {self.internal_energy:.6g}, Z(virial) = {self.virial_z:.6g}, "
                f"1/(rho kT kappa) = {self.inverse_compressibility:.6g} (compressibility), "
                f"{self.virial_inverse_compressibility:.6g} (virial)"
            )
        else:
            lines.append(f"  {self.message}")
        return "\n".join(lines)


def _frozen(array: Array) -> Array:
    array = np.ascontiguousarray(array)
    array.setflags(write=False)
    return array


def reduced_fluid(mixture: Mixture, state: State) -> tuple[Fluid, float]:
    """The state in units of the smallest diameter and kT, as a batch of one; and that diameter."""
    i, j = np.triu_indices(mixture.species)
    length = float(mixture.pairs.diameter.min())
    fluid = Fluid(
        rho=(mixture.densities(state) * length**3)[None],
        core=(mixture.pairs.diameter[i, j] / length)[None],
        edge=(mixture.pairs.well_edge[i, j] / length)[None],
        attraction=mixture.reduced_depths(state)[i, j][None],
    )
    return fluid, length
