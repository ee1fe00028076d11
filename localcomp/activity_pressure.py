"""Activity coefficients of the square-well mixture at constant pressure.

The energy-route equation of state gives the packing fraction of every composition, pure liquids included:
    beta P = rho [Z_hs(x, eta) + sum_j x_j beta mu_j,at - a_at]
with beta mu_j,at = int_0^beta (dU/dN_j) d beta' at constant volume (`betapath`). Then
    ln gamma_i = ln(rho_i/rho_i,pure) - ln x_i + beta mu_i,res(mixture) - beta mu_i,res(pure i), each at P.
Parts: Flory-Huggins as at constant packing fraction; attraction the difference of beta mu_at; hard spheres
the rest, which holds the change of volume on mixing at the ideal-gas and hard-sphere level.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike

from localcomp.activity import ISLAND, checked_fractions, disconnected
from localcomp.activity_parts import (
    Activity,
    Array,
    Parts,
    densities,
    flory_huggins,
    mole_fractions_of,
    nothing,
    scan_rows,
    volume_fractions,
    with_curve,
)  # fmt: skip
from localcomp.betapath import BetaPath, beta_paths
from localcomp.chebyshev import Interpolant, chebyshev_points
from localcomp.energyroute import energy_route
from localcomp.errors import NoAnswer
from localcomp.hardspheres import bmcsl_chemical_potentials, bmcsl_compressibility_factor
from localcomp.inputs import MAX_PACKING
from localcomp.kirkwoodbuff import pressure_slope
from localcomp.stability import inverse_concentration_fluctuations
from ozsolve import DEFAULT_ACCURACY, Mixture, State, get_closure

DEGREE = 8
"""In the volume fraction; the values at its points are exact derivatives already, so that fewer serve."""
PRESSURE_TOLERANCE = 1e-6
"""On Z - P/(rho kT); ln gamma then moves by less, since P enters it through excess volumes only."""
MOST_ROUNDS = 12
LONGEST_STEP = 0.12
"""Largest change of ln eta in a round."""
LOWEST_PACKING = 0.02


@dataclass(frozen=True)
class LiquidState:
    """One composition at the density that meets the pressure.

    Attributes
    ----------
    packing_fraction : float
    z : float
        P/(rho kT) reached.
    chemical_potentials : ndarray, shape (s,)
        Residual, attraction part, over kT.
    path : BetaPath or None
        None where no density was found.
    reason : str
    """

    packing_fraction: float
    z: float
    chemical_potentials: Array
    path: BetaPath | None
    reason: str = ""


def energy_pressure(mixture: Mixture, state: State, closure: str, accuracy: float) -> float:
    """P of a state by the energy route, energy unit over cubed length unit.

    Raises
    ------
    NoAnswer
        If the state's path in beta is not available.
    """
    route = energy_route(mixture, state, closure, accuracy)
    return route.z * float(mixture.densities(state).sum()) * state.temperature


def liquids_at_pressure(
    mixture: Mixture, temperature: float, pressure: float, x: Array, start: Array, closure: str, accuracy: float
) -> list[LiquidState]:
    """Densities of many compositions at one pressure, solved together.

    Newton's method in ln eta with the compressibility route's slope first, the secant from then on. It
    starts in the liquid and walks to the nearest density; a composition whose walk leaves the region
    with solutions is not available.

    Parameters
    ----------
    x : ndarray, shape (m, s)
    start : ndarray, shape (m,)
        Packing fractions to start from.
    """
    searches = [_Search(row, float(eta)) for row, eta in zip(x, start, strict=True)]
    for _ in range(MOST_ROUNDS):
        open_ones = [search for search in searches if search.open]
        ends = [(mixture, State(temperature, tuple(s.x), packing_fraction=s.eta)) for s in open_ones]
        for search, path in zip(open_ones, beta_paths(ends, closure, accuracy), strict=True):
            search.advance(path, pressure)
    return [search.result(mixture.species) for search in searches]


@dataclass
class _Search:
    """The walk of one composition to its density."""

    x: Array
    eta: float
    last: tuple[float, float] | None = None
    found: BetaPath | None = None
    z: float = math.nan
    reason: str = ""

    @property
    def open(self) -> bool:
        return self.found is None and not self.reason

    def advance(self, path: BetaPath, pressure: float) -> None:
        """One round: accept, move, or give up with a reason."""
        if not path.usable:
            self.reason = f"no density found at this pressure: at packing fraction {self.eta:.4f} {path.reason}"
            return
        mixture = path.mixture
        rho = mixture.densities(path.state)
        total = float(rho.sum())
        self.z = bmcsl_compressibility_factor(rho, mixture.diameter) + path.z_attraction
        miss = total * self.z - pressure / path.state.temperature
        if abs(miss) < PRESSURE_TOLERANCE * total:
            self.found = path
            return
        slope = total * path.end.inverse_compressibility
        if self.last is not None and miss != self.last[1]:
            slope = (miss - self.last[1]) / math.log(self.eta / self.last[0])
            if slope <= 0.0:
                self.reason = f"no stable liquid at this pressure near packing fraction {self.eta:.4f}"
                return
        self.last = (self.eta, miss)
        step = float(np.clip(-miss / slope, -LONGEST_STEP, LONGEST_STEP))
        self.eta = min(self.eta * math.exp(step), 0.5 * (self.eta + MAX_PACKING))
        if self.eta < LOWEST_PACKING:
            self.reason = f"no liquid at this pressure: the density falls below packing fraction {LOWEST_PACKING}"

    def result(self, species: int) -> LiquidState:
        """The end of the walk."""
        if self.found is not None:
            return LiquidState(self.eta, self.z, self.found.chemical_potentials(), self.found)
        reason = self.reason or f"the density at this pressure was not found in {MOST_ROUNDS} rounds"
        return LiquidState(math.nan, math.nan, nothing(1, species)[0], None, reason)


def activity_at_pressure(
    mixture: Mixture,
    temperature: float,
    pressure: float,
    mole_fractions: ArrayLike,
    *,
    start: float | Sequence[float] = 0.4,
    closure: str = "rhnc",
    accuracy: float = DEFAULT_ACCURACY,
) -> Activity:
    """Activity coefficients, excess volume and enthalpy at constant pressure.

    Parameters
    ----------
    mixture : Mixture
        Any number of species, additive diameters.
    temperature : float
        kT in the mixture's energy unit.
    pressure : float
        Energy unit over cubed length unit.
    mole_fractions : array_like, shape (m, s)
    start : float or sequence of float
        Packing fractions from which densities are sought: one, or one per pure liquid (mixtures then start from
        their average by volume).
    closure, accuracy :
        As for `activity_at_packing`.

    Returns
    -------
    Activity
        Two species: at Chebyshev points of the volume fraction, then interpolated (Flory-Huggins aside);
        `kirkwood_buff` integrates the k = 0 limits at the same points. More species, or a gap in the
        isotherm: each composition by itself, and no Kirkwood-Buff integral.

    Raises
    ------
    NoAnswer
        If the diameters are not additive or a pure liquid has no density at this pressure.
    """
    x = checked_fractions(mixture, mole_fractions)
    closure = get_closure(closure).name
    size = mixture.species
    corners = np.broadcast_to(np.asarray(start, dtype=np.float64), (size,))

    def solved(rows: Array) -> list[LiquidState]:
        begin = volume_fractions(mixture.diameter, rows) @ corners
        return liquids_at_pressure(mixture, temperature, pressure, rows, begin, closure, accuracy)

    if size == 2:
        points = chebyshev_points(DEGREE)
        nodes = mole_fractions_of(mixture.diameter, np.stack((points, 1.0 - points), axis=1))
        along = solved(nodes)
        pures = [along[-1], along[0]]
        _need(pures, mixture)
        if all(state.path is not None for state in along):
            at_nodes = _assemble(mixture, temperature, pressure, nodes, closure, along, pures)
            return with_curve(_interpolated(at_nodes, scan_rows(x), along, pures))
        found = solved(x)
        fraction = np.concatenate((nodes[:, 0], x[:, 0]))
        good = np.array([state.path is not None for state in (*along, *found)])
        for n in np.flatnonzero(disconnected(fraction, good, x[:, 0])).tolist():
            found[n] = replace(found[n], path=None, packing_fraction=math.nan, reason=found[n].reason or ISLAND)
    else:
        pures = solved(np.eye(size))
        _need(pures, mixture)
        found = solved(x)
    return _assemble(mixture, temperature, pressure, x, closure, found, pures)


def _need(pures: list[LiquidState], mixture: Mixture) -> None:
    for name, pure in zip(mixture.names, pures, strict=True):
        if pure.path is None:
            raise NoAnswer(f"pure {name}: {pure.reason}")


def _assemble(
    mixture: Mixture, temperature: float, pressure: float, x: Array, closure: str, found: list[LiquidState],
    pures: list[LiquidState],
) -> Activity:  # fmt: skip
    """Every composition from its own solved state."""
    count, size = x.shape
    diameter = mixture.diameter
    volume = math.pi / 6.0 * diameter**3
    fh = flory_huggins(diameter, x)
    hard, attraction, error = nothing(count, size), nothing(count, size), nothing(count, size)
    energy, scc = np.full(count, math.nan), np.full(count, math.nan)
    eta = np.array([state.packing_fraction for state in found])
    pure_eta = np.array([pure.packing_fraction for pure in pures])
    pure_hard = np.array(
        [bmcsl_chemical_potentials(densities(diameter, row, e), diameter)[i]
         for i, (row, e) in enumerate(zip(np.eye(size), pure_eta, strict=True))]
    )  # fmt: skip
    pure_mu = np.array([pure.chemical_potentials[i] for i, pure in enumerate(pures)])
    pure_bar = np.array([_bar(pure)[i] for i, pure in enumerate(pures)])
    pure_energy = np.array([pure.path.energies[-1] if pure.path is not None else math.nan for pure in pures])
    for n, state in enumerate(found):
        if state.path is None:
            continue
        share = volume / float(x[n] @ volume)
        hs = bmcsl_chemical_potentials(densities(diameter, x[n], state.packing_fraction), diameter)
        hard[n] = hs - pure_hard + np.log(state.packing_fraction / pure_eta) - 1.0 + share
        attraction[n] = state.chemical_potentials - pure_mu
        error[n] = _bar(state) + pure_bar
        energy[n] = state.path.energies[-1] - x[n] @ pure_energy
        scc[n] = inverse_concentration_fluctuations([state.path.end])[0]
    ln_gamma = fh + hard + attraction
    molecular = (x @ volume) / eta - x @ (volume / pure_eta)
    return Activity(
        mixture=mixture, temperature=temperature, basis="pressure", closure=closure, mole_fractions=x,
        packing_fraction=eta, ln_gamma=ln_gamma, parts=Parts(fh, hard, attraction),
        excess_free_energy=np.sum(x * ln_gamma, axis=1), excess_energy=energy, excess_volume=molecular,
        excess_enthalpy=energy + pressure / temperature * molecular, numerical_error=error, interpolation_error=0.0,
        interpolated=False, kirkwood_buff=nothing(count, size), inverse_scc=scc,
        reasons=tuple(state.reason for state in found), curve=None,
        pressure=pressure,
    )  # fmt: skip


def _bar(state: LiquidState) -> Array:
    """Error bar of beta mu_at, shape (s,): that of the energy, in the proportion of the two."""
    if state.path is None:
        return np.full(len(state.chemical_potentials), math.nan)
    value, bar = state.path.helmholtz, state.path.helmholtz_error
    return np.abs(state.chemical_potentials) * (bar / abs(value) if value != 0.0 else 0.0)


def _interpolated(nodes: Activity, x: Array, along: list[LiquidState], pures: list[LiquidState]) -> Activity:
    """Two species: from the nodes to the compositions asked, in the volume fraction of the first."""
    mixture = nodes.mixture
    diameter, volume = mixture.diameter, math.pi / 6.0 * mixture.diameter**3
    points = chebyshev_points(len(along) - 1)
    s = volume_fractions(diameter, x)[:, 0]
    fh = flory_huggins(diameter, x)
    hard, attraction = Interpolant(nodes.parts.hard_sphere), Interpolant(nodes.parts.attraction)
    rest = Interpolant(nodes.parts.hard_sphere + nodes.parts.attraction)
    cut = np.abs(rest(s) - rest.shortened()(s))
    ln_gamma = fh + hard(s) + attraction(s)
    eta = Interpolant(nodes.packing_fraction)(s)
    per_volume = Interpolant(nodes.excess_energy / (nodes.mole_fractions @ volume))
    energy = per_volume(s) * (x @ volume)
    pure_eta = np.array([pure.packing_fraction for pure in pures])
    molecular = (x @ volume) / eta - x @ (volume / pure_eta)
    assert nodes.pressure is not None
    slopes = []
    mean = 1.0 / np.sum(np.stack((points, 1.0 - points), axis=1) / diameter**3, axis=1)
    for state, v in zip(along, mean, strict=True):
        assert state.path is not None
        by_volume_fraction = v**2 / float(np.prod(diameter**3))  # dx/ds
        slopes.append(pressure_slope(state.path.end, by_volume_fraction * np.array([1.0, -1.0])))
    kb_slopes = Interpolant(np.array(slopes))
    kb = kb_slopes.integral(s)
    kb[:, 0] -= kb_slopes.integral(np.array([1.0]))[0, 0]
    return replace(
        nodes, mole_fractions=x, packing_fraction=eta, ln_gamma=ln_gamma, parts=Parts(fh, hard(s), attraction(s)),
        excess_free_energy=np.sum(x * ln_gamma, axis=1), excess_energy=energy, excess_volume=molecular,
        excess_enthalpy=energy + nodes.pressure / nodes.temperature * molecular,
        numerical_error=Interpolant(nodes.numerical_error)(s) + cut, interpolation_error=float(cut.max()),
        interpolated=True, kirkwood_buff=kb, inverse_scc=Interpolant(nodes.inverse_scc)(s), reasons=("",) * len(x),
        curve=None,
    )  # fmt: skip
