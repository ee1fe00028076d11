"""What an activity calculation gives, and its two closed-form parts."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from localcomp.hardspheres import bmcsl_chemical_potentials, bmcsl_compressibility_factor, bmcsl_helmholtz
from ozsolve import Mixture

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Parts:
    """The parts of ln gamma, each of shape (m, s); they sum to it."""

    flory_huggins: Array
    hard_sphere: Array
    attraction: Array


SCAN_POINTS = 101
"""Compositions of a curve."""


@dataclass(frozen=True)
class Curve:
    """A whole isotherm of two species, for figures and the search for splitting.

    Attributes
    ----------
    mole_fractions : ndarray, shape (p, 2)
        From pure species 2 to pure species 1, ends included.
    ln_gamma, kirkwood_buff : ndarray, shape (p, 2)
    inverse_scc : ndarray, shape (p,)
    """

    mole_fractions: Array
    ln_gamma: Array
    kirkwood_buff: Array
    inverse_scc: Array


@dataclass(frozen=True)
class Activity:
    """Activity coefficients of one mixture at one temperature under one closure.

    m compositions, s species; NaN where a composition is unavailable (`reasons` says why).

    Attributes
    ----------
    mixture : Mixture
    temperature : float
        kT in the mixture's energy unit.
    basis : {"packing", "pressure"}
    closure : str
    mole_fractions : ndarray, shape (m, s)
    packing_fraction : ndarray, shape (m,)
    pressure : float or None
        Energy unit over cubed length unit; None at constant packing fraction.
    ln_gamma : ndarray, shape (m, s)
        Of every species, also where its mole fraction is zero (infinite dilution).
    parts : Parts
    excess_free_energy : ndarray, shape (m,)
        sum x_i ln gamma_i: A_ex/(N kT) at constant packing fraction, G_ex/(N kT) at constant pressure.
    excess_energy : ndarray, shape (m,)
        U_ex/(N kT).
    excess_volume : ndarray, shape (m,)
        Cubed length unit per molecule; zero at constant packing fraction.
    excess_enthalpy : ndarray, shape (m,)
        H_ex/(N kT); NaN at constant packing fraction.
    numerical_error : ndarray, shape (m, s)
        Error bar of ln gamma from grids, quadrature and interpolation.
    interpolated : bool
    interpolation_error : float
        The interpolation's share, its largest.
    kirkwood_buff : ndarray, shape (m, s)
        ln gamma by the Kirkwood-Buff route; NaN where not worked out.
    inverse_scc : ndarray, shape (m,)
        x1 x2/S_cc(0) (more species: see `stability`): 1 if ideal, 0 at the spinodal of the closure.
    reasons : tuple of str
        Empty where a composition is available.
    curve : Curve or None
        The isotherm, where it could be interpolated.
    """

    mixture: Mixture
    temperature: float
    basis: str
    closure: str
    mole_fractions: Array
    packing_fraction: Array
    pressure: float | None
    ln_gamma: Array
    parts: Parts
    excess_free_energy: Array
    excess_energy: Array
    excess_volume: Array
    excess_enthalpy: Array
    numerical_error: Array
    interpolated: bool
    interpolation_error: float
    kirkwood_buff: Array
    inverse_scc: Array
    reasons: tuple[str, ...]
    curve: Curve | None

    @property
    def route_gap(self) -> Array:
        """ln gamma by Kirkwood-Buff minus that by the energy route, shape (m, s)."""
        return np.asarray(self.kirkwood_buff - self.ln_gamma)

    @property
    def available(self) -> NDArray[np.bool_]:
        """Which compositions have numbers, shape (m,)."""
        return np.array([not reason for reason in self.reasons])


def scan_rows(x: Array) -> Array:
    """The compositions asked with those of the curve behind them."""
    first = np.linspace(0.0, 1.0, SCAN_POINTS)
    return np.concatenate((x, np.stack((first, 1.0 - first), axis=1)))


def with_curve(whole: Activity) -> Activity:
    """From one for `scan_rows`: the compositions asked, and the curve apart."""
    head, tail = slice(None, -SCAN_POINTS), slice(-SCAN_POINTS, None)
    curve = Curve(whole.mole_fractions[tail], whole.ln_gamma[tail], whole.kirkwood_buff[tail], whole.inverse_scc[tail])
    parts = whole.parts
    rows = {
        name: getattr(whole, name)[head]
        for name in (
            "mole_fractions", "packing_fraction", "ln_gamma", "excess_free_energy", "excess_energy", "excess_volume",
            "excess_enthalpy", "numerical_error", "kirkwood_buff", "inverse_scc", "reasons",
        )
    }  # fmt: skip
    short = Parts(parts.flory_huggins[head], parts.hard_sphere[head], parts.attraction[head])
    return replace(whole, parts=short, curve=curve, **rows)


def nothing(count: int, species: int) -> Array:
    """NaN, shape (count, species)."""
    return np.full((count, species), math.nan)


def volume_fractions(diameter: Array, x: Array) -> Array:
    """phi_i = x_i sigma_i^3/sum, shape (m, s)."""
    weighted = x * diameter**3
    return np.asarray(weighted / weighted.sum(axis=1, keepdims=True))


def mole_fractions_of(diameter: Array, phi: Array) -> Array:
    """x_i from volume fractions, shape (m, s)."""
    counts = phi / diameter**3
    return np.asarray(counts / counts.sum(axis=1, keepdims=True))


def flory_huggins(diameter: Array, x: Array) -> Array:
    """ln(v_i/v) + 1 - v_i/v, shape (m, s). Flory, J. Chem. Phys. 10 (1942) 51, eq. 10 for molar volumes as
    segment numbers; Huggins, J. Chem. Phys. 9 (1941) 440."""
    volume = diameter**3
    ratio = volume / (x @ volume)[:, None]
    return np.asarray(np.log(ratio) + 1.0 - ratio)


def densities(diameter: Array, x: Array, eta: float) -> Array:
    """rho_i at a packing fraction, shape (s,)."""
    return np.asarray(x * (eta * 6.0 / math.pi / float(x @ diameter**3)))


def hard_spheres_at_packing(diameter: Array, x: Array, eta: float) -> Array:
    """Hard-sphere part of ln gamma at constant packing fraction, shape (m, s)."""
    rows = [_hard_row(diameter, row, eta) for row in x]
    pures = np.array([bmcsl_helmholtz(densities(diameter, row, eta), diameter) for row in np.eye(len(diameter))])
    return np.asarray(np.array(rows) - pures)


def _hard_row(diameter: Array, x: Array, eta: float) -> Array:
    rho, volume = densities(diameter, x, eta), diameter**3
    slope = bmcsl_compressibility_factor(rho, diameter) - 1.0
    return np.asarray(bmcsl_chemical_potentials(rho, diameter) - volume / float(x @ volume) * slope)
