"""Activity coefficients of the square-well mixture at constant packing fraction.

Definition. Pure liquids and mixture have one packing fraction eta and one temperature, so volumes add up.
With A_ex the excess Helmholtz energy over the ideal mixture of mole fractions,
    ln gamma_i = d[n A_ex/(N kT)]/d n_i at constant T and eta                (a mole-number derivative)
    A_ex/(N kT) = sum_i x_i ln(phi_i/x_i)                                     Flory-Huggins
                  + a_hs(x, eta) - sum_i x_i a_cs(eta)                        hard spheres
                  + a_at(x, eta, T) - sum_i x_i a_at,i(eta, T)                attraction
phi_i = x_i v_i/v, v_i = pi sigma_i^3/6, v = sum x_i v_i. In terms of constant-volume chemical potentials
d(n a)/d n_i at constant eta = beta mu_i - (v_i/v) rho da/drho, since eta rises by v_i/V with each particle.
Flory, J. Chem. Phys. 10 (1942) 51; Huggins, J. Chem. Phys. 9 (1941) 440, whose sum arises here from the ideal
gas: ln of rho_i in the mixture over rho of the pure liquid.

Two species: a_at/v, an energy per volume, is interpolated in the volume fraction at Chebyshev points, ends
included; of mole, surface and volume fraction this one converges fastest when sizes differ. More species,
and isotherms with a gap: implicit derivatives at every composition.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike, NDArray

from localcomp.activity_parts import (
    Activity,
    Array,
    Parts,
    flory_huggins,
    hard_spheres_at_packing,
    mole_fractions_of,
    nothing,
    scan_rows,
    volume_fractions,
    with_curve,
)  # fmt: skip
from localcomp.betapath import BetaPath, beta_paths
from localcomp.chebyshev import Interpolant, chebyshev_points
from localcomp.errors import NoAnswer
from localcomp.kirkwoodbuff import isotherm_ln_gamma, ray_ln_gamma
from localcomp.stability import inverse_concentration_fluctuations
from ozsolve import DEFAULT_ACCURACY, Mixture, State, get_closure

DEGREES = (10, 20)
"""Degrees in the volume fraction, tried in turn; the points of each are among those of the next."""
WANTED = 3e-5
"""Estimated error of ln gamma from interpolation that is good enough."""


def activity_at_packing(
    mixture: Mixture,
    temperatures: float | Sequence[float],
    packing_fraction: float,
    mole_fractions: ArrayLike,
    *,
    closure: str = "rhnc",
    accuracy: float = DEFAULT_ACCURACY,
    routes: bool = True,
) -> list[Activity]:
    """Activity coefficients at constant packing fraction.

    Parameters
    ----------
    mixture : Mixture
        Any number of species, additive diameters.
    temperatures : float or sequence of float
        kT in the mixture's energy unit.
    packing_fraction : float
    mole_fractions : array_like, shape (m, s)
        Compositions; a zero is infinite dilution, and ln gamma of that species its limit.
    closure : str
    accuracy : float
        Relative, on coordination numbers.
    routes : bool
        Whether to integrate the Kirkwood-Buff route too. For two species it costs nothing. For more it takes
        further states, and these also show whether a composition is cut off from every pure liquid by
        compositions without a solution; without the routes that goes unseen.

    Returns
    -------
    list of Activity
        One per temperature. Compositions whose path in beta has no solution carry NaN and a reason.

    Raises
    ------
    NoAnswer
        If the diameters are not additive, or a pure liquid is unavailable.

    Examples
    --------
    >>> like = Mixture([1.0, 1.0], [1.0, 1.0])
    >>> (found,) = activity_at_packing(like, 2.0, 0.4, [[0.0, 1.0], [0.5, 0.5]])
    >>> bool(abs(found.ln_gamma).max() < 1e-10)
    True
    """
    x = checked_fractions(mixture, mole_fractions)
    closure = get_closure(closure).name
    kelvins = [float(t) for t in np.atleast_1d(np.asarray(temperatures, dtype=np.float64))]
    if mixture.species != 2:
        return [_direct(mixture, t, packing_fraction, x, closure, accuracy, routes) for t in kelvins]
    found: list[Activity | None] = [None] * len(kelvins)
    paths: dict[tuple[int, float], BetaPath] = {}
    for degree in DEGREES:
        todo = [n for n, activity in enumerate(found) if activity is None or _rough(activity)]
        _solve_nodes(mixture, kelvins, packing_fraction, degree, closure, accuracy, todo, paths)
        for n in todo:
            nodes = [paths[n, float(s)] for s in chebyshev_points(degree)]
            if all(path.usable for path in nodes):
                found[n] = with_curve(_isotherm(mixture, kelvins[n], packing_fraction, scan_rows(x), closure, nodes))
            elif found[n] is None:
                first = mole_fractions_of(mixture.diameter, _both(chebyshev_points(degree)))[:, 0]
                tried = first, np.array([path.usable for path in nodes])
                found[n] = _direct(mixture, kelvins[n], packing_fraction, x, closure, accuracy, routes, tried)
    return [activity for activity in found if activity is not None]


def checked_fractions(mixture: Mixture, mole_fractions: ArrayLike) -> Array:
    """Compositions as an array of shape (m, s); `State` names what is wrong with a row."""
    rows = np.atleast_2d(np.asarray(mole_fractions, dtype=np.float64))
    for row in rows:
        mixture.densities(State(1.0, tuple(row), packing_fraction=0.1))
    return rows


def _rough(activity: Activity) -> bool:
    return activity.interpolated and activity.interpolation_error > WANTED


def _solve_nodes(
    mixture: Mixture, kelvins: list[float], eta: float, degree: int, closure: str, accuracy: float, todo: list[int],
    paths: dict[tuple[int, float], BetaPath],
) -> None:  # fmt: skip
    keys = [(n, float(s)) for n in todo for s in chebyshev_points(degree) if (n, float(s)) not in paths]
    ends = []
    for n, s in keys:
        row = mole_fractions_of(mixture.diameter, _both(np.array([s])))[0]
        ends.append((mixture, State(kelvins[n], tuple(row), packing_fraction=eta)))
    paths.update(zip(keys, beta_paths(ends, closure, accuracy), strict=True))


def _isotherm(
    mixture: Mixture, temperature: float, eta: float, x: Array, closure: str, nodes: list[BetaPath]
) -> Activity:
    """Two species, every node available: everything from interpolants in the volume fraction s of species 1."""
    points = chebyshev_points(len(nodes) - 1)
    volume = mixture.diameter**3
    mean = 1.0 / (points / volume[0] + (1.0 - points) / volume[1])
    s = volume_fractions(mixture.diameter, x)[:, 0]
    energy = _mixing(np.array([path.helmholtz for path in nodes]) / mean, points)
    attraction = _partial(Interpolant(energy), volume, s)
    shorter = _partial(Interpolant(energy).shortened(), volume, s)
    decay = _decay(Interpolant(energy).coefficients)
    cut = np.abs(attraction - shorter) * decay
    bar = max(path.helmholtz_error / v for path, v in zip(nodes, mean, strict=True))
    internal = Interpolant(_mixing(np.array([path.energies[-1] for path in nodes]) / mean, points))
    fh, hs = flory_huggins(mixture.diameter, x), hard_spheres_at_packing(mixture.diameter, x, eta)
    kb = isotherm_ln_gamma(mixture, [path.end for path in nodes], eta, s)
    scc = inverse_concentration_fluctuations([path.end for path in nodes])
    ln_gamma = fh + hs + attraction
    return Activity(
        mixture=mixture, temperature=temperature, basis="packing", closure=closure, mole_fractions=x,
        packing_fraction=np.full(len(x), eta), ln_gamma=ln_gamma, parts=Parts(fh, hs, attraction),
        excess_free_energy=np.sum(x * ln_gamma, axis=1),
        excess_energy=internal(s) * (x @ volume),
        excess_volume=np.zeros(len(x)), excess_enthalpy=np.full(len(x), math.nan),
        numerical_error=cut + bar * volume, interpolation_error=float(cut.max()), interpolated=True,
        kirkwood_buff=kb, inverse_scc=Interpolant(scc)(s), reasons=("",) * len(x), curve=None, pressure=None,
    )  # fmt: skip


def _both(s: Array) -> Array:
    """Fractions of both species from those of the first, shape (m, 2)."""
    return np.stack((s, 1.0 - s), axis=1)


def _mixing(values: Array, points: Array) -> Array:
    """Values over the straight line between the ends, shape (n,)."""
    return np.asarray(values - values[-1] * points - values[0] * (1.0 - points))


def _partial(f: Interpolant, volume: Array, s: Array) -> Array:
    """d(V f)/d n_i for an energy per volume f(s), shape (m, 2)."""
    value, slope = f(s), f.slope(s)
    return np.stack((volume[0] * (value + (1.0 - s) * slope), volume[1] * (value - s * slope)), axis=1)


ISLAND = "it lies between compositions without a solution, in the two-phase region"
NO_WAY_OUT = (
    "no straight line of compositions to a pure liquid has solutions throughout: it lies in the two-phase region"
)
LEAST_DECAY = 0.1
"""Coefficients do not shrink evenly: two more are never counted on for more than this."""


def _decay(coefficients: Array) -> float:
    """By how much two more coefficients shrink, from the last four; between `LEAST_DECAY` and 1."""
    sizes = np.abs(coefficients).reshape(len(coefficients), -1).max(axis=1)
    before = float(sizes[-4:-2].max())
    return min(max(float(sizes[-2:].max()) / before, LEAST_DECAY), 1.0) if before > 0.0 else 0.0


def disconnected(fraction: Array, good: NDArray[np.bool_], asked: Array) -> NDArray[np.bool_]:
    """Which compositions of two species lie between compositions without a solution.

    A solution there is an island inside the two-phase region: its path in beta, or the isotherm, has crossed
    it. Shape of `asked`.

    Parameters
    ----------
    fraction : ndarray, shape (p,)
        Of the first species, everything that was tried.
    good : ndarray of bool, shape (p,)
    asked : ndarray, shape (m,)
    """
    bad = fraction[~good]
    if len(bad) == 0:
        return np.zeros(len(asked), bool)
    return np.asarray((asked > bad.min()) & (asked < bad.max()))


def pure_paths(
    mixture: Mixture, temperature: float, etas: Sequence[float], closure: str, accuracy: float
) -> list[BetaPath]:
    """Paths of the pure liquids, each at its own packing fraction.

    Raises
    ------
    NoAnswer
        Naming the pure liquid that has no solution.
    """
    size = mixture.species
    ends = [
        (mixture, State(temperature, tuple(row), packing_fraction=eta))
        for row, eta in zip(np.eye(size), etas, strict=True)
    ]
    paths = beta_paths(ends, closure, accuracy)
    for name, path in zip(mixture.names, paths, strict=True):
        if not path.usable:
            raise NoAnswer(f"pure {name} at packing fraction {path.state.packing_fraction:.4g}: {path.reason}")
    return paths


def _direct(
    mixture: Mixture, temperature: float, eta: float, x: Array, closure: str, accuracy: float, routes: bool,
    tried: tuple[Array, NDArray[np.bool_]] | None = None,
) -> Activity:  # fmt: skip
    """Any number of species: implicit derivatives at every composition whose path is available.

    `tried`: for two species, fractions of the first that were tried before, and which have a path.
    """
    count, size = x.shape
    pures = pure_paths(mixture, temperature, [eta] * size, closure, accuracy)
    ends = [(mixture, State(temperature, tuple(row), packing_fraction=eta)) for row in x]
    paths = beta_paths(ends, closure, accuracy)
    reasons = [path.reason for path in paths]
    if tried is not None:
        fraction = np.append(tried[0], x[:, 0])
        good = np.append(tried[1], [not reason for reason in reasons])
        for n in np.flatnonzero(disconnected(fraction, good, x[:, 0])).tolist():
            reasons[n] = reasons[n] or ISLAND
    volume = mixture.diameter**3
    nan = nothing(count, size)
    attraction, error, kb = nan.copy(), nan.copy(), nan.copy()
    energy, scc = np.full(count, math.nan), np.full(count, math.nan)
    pure_energy = np.array([path.energies[-1] for path in pures])
    pure_a = np.array([path.helmholtz for path in pures])
    pure_bar = np.array([path.helmholtz_error for path in pures])
    for n, path in enumerate(paths):
        if reasons[n]:
            continue
        if routes:
            kb[n] = ray_ln_gamma(mixture, path.state, path.end, closure, accuracy)
            if np.isnan(kb[n]).all():
                reasons[n] = NO_WAY_OUT
                continue
        mu, share = path.chemical_potentials(), volume / float(x[n] @ volume)
        attraction[n] = mu - share * float(x[n] @ mu - path.helmholtz) - pure_a
        error[n] = share * path.helmholtz_error + pure_bar
        energy[n] = path.energies[-1] - x[n] @ pure_energy
        scc[n] = inverse_concentration_fluctuations([path.end])[0]
    fh, hs = flory_huggins(mixture.diameter, x), hard_spheres_at_packing(mixture.diameter, x, eta)
    ln_gamma = fh + hs + attraction
    return Activity(
        mixture=mixture, temperature=temperature, basis="packing", closure=closure, mole_fractions=x,
        packing_fraction=np.full(count, eta), ln_gamma=ln_gamma, parts=Parts(fh, hs, attraction),
        excess_free_energy=np.sum(x * ln_gamma, axis=1), excess_energy=energy, excess_volume=np.zeros(count),
        excess_enthalpy=np.full(count, math.nan), numerical_error=error, interpolation_error=0.0, interpolated=False,
        kirkwood_buff=kb, inverse_scc=scc, reasons=tuple(reasons), curve=None, pressure=None,
    )  # fmt: skip
