"""Activity models regressed to ln gamma, as practice does with measured data."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import least_squares

from localcomp.models import ActivityModel, Adjustable, ModelInput, Reading, ln_gamma
from ozsolve import Mixture

Array = NDArray[np.float64]

RANDOM_STARTS = 4
SEED = 20240601
LARGEST = 15.0
"""Largest |energy|/kT a start or a fit may reach at the lowest temperature."""
SAME_MINIMUM = 1e-4
"""Parameters in units of the largest depth that count as the same minimum."""


@dataclass(frozen=True)
class Regression:
    """One model fitted to one pair.

    Attributes
    ----------
    model : ActivityModel
    values : ndarray, shape (p,)
        Energies of `model.adjustable`, energy unit of the mixture.
    standard_errors : ndarray, shape (p,)
        From the covariance at the minimum, s^2 (J^T J)^-1 (Bard, Nonlinear Parameter Estimation, 1974, section 7-5).
    correlation : float
        Between the two parameters; NaN for one.
    rms, largest : float
        Of the differences in ln gamma.
    minima : int
        Different minima among the starts, this one (the lowest) included.
    """

    model: ActivityModel
    values: Array
    standard_errors: Array
    correlation: float
    rms: float
    largest: float
    minima: int


def reading_of(model: ActivityModel) -> Reading:
    """The reading under which fitted energies enter: as they are; the one-fluid energy with all its contacts."""
    return Reading.ALL_CONTACTS if model.adjustable is Adjustable.UNLIKE else Reading.ONE_CONTACT


def pair_matrix(model: ActivityModel, values: Array) -> Array:
    """Fitted energies of a pair as a (2, 2) table: D_ij, w_ij or e_ij off the diagonal."""
    first, second = float(values[0]), float(values[-1])
    return np.array([[0.0, first], [second, 0.0]])


def fitted_input(
    model: ActivityModel, mixture: Mixture, energies: Array, temperatures: Array, mole_fractions: Array, z: float,
    segment: float | None = None,
) -> ModelInput:  # fmt: skip
    """What a model is told when its energies are fitted ones.

    Parameters
    ----------
    energies : ndarray, shape (s, s)
        Off the diagonal as `pair_matrix` has them.
    temperatures : ndarray, shape (n,)
    mole_fractions : ndarray, shape (n, s)
    segment : float, optional
        As in `ModelInput`; binaries whose energies go into a ternary need one in common, as r and q scale with it.
    """
    count = len(temperatures)
    warmth = temperatures[:, None, None]
    size = len(energies)
    own = np.diag(np.diag(mixture.pairs.well_depth))
    depth = np.broadcast_to(own + energies * (1.0 - np.eye(size)), (count, size, size)) / warmth
    exchange = np.broadcast_to(energies, (count, size, size)) / warmth
    return ModelInput(
        depth,
        np.broadcast_to(mixture.diameter, (count, size)),
        mole_fractions,
        np.broadcast_to(mixture.pairs.diameter, (count, size, size)),
        np.full(count, z),
        segment,
        None if model.adjustable is Adjustable.UNLIKE else exchange,
    )


def fitted_ln_gamma(
    model: ActivityModel, mixture: Mixture, energies: Array, temperatures: Array, mole_fractions: Array, z: float,
    segment: float | None = None,
) -> Array:  # fmt: skip
    """ln gamma_i of a model with fitted energies, shape (n, s)."""
    given = fitted_input(model, mixture, energies, temperatures, mole_fractions, z, segment)
    return ln_gamma(model, given, reading_of(model))


def true_values(model: ActivityModel, mixture: Mixture) -> Array:
    """What the parameters are for one contact: eps_ij - eps_ii, eps_ij - (eps_ii + eps_jj)/2, or eps_ij."""
    e = mixture.pairs.well_depth
    if model.adjustable is Adjustable.EXCHANGE:
        return np.array([e[0, 1] - e[0, 0], e[0, 1] - e[1, 1]])
    if model.adjustable is Adjustable.INTERCHANGE:
        return np.array([e[0, 1] - 0.5 * (e[0, 0] + e[1, 1])])
    return np.array([e[0, 1]])


def regress(
    model: ActivityModel, mixture: Mixture, temperatures: Array, mole_fractions: Array, target: Array, z: float,
    segment: float | None = None,
) -> Regression:  # fmt: skip
    """Fit a model's energies to ln gamma of a pair.

    Parameters
    ----------
    temperatures : ndarray, shape (n,)
    mole_fractions : ndarray, shape (n, 2)
    target : ndarray, shape (n, 2)
        ln gamma_i; NaN is left out.
    segment : float, optional
        As in `fitted_input`.

    Raises
    ------
    ValueError
        If there are fewer numbers than parameters.

    Notes
    -----
    Least squares (trust region reflective, `scipy.optimize.least_squares`) from several starts: no energies, the true
    ones under both readings, and seeded random ones; the lowest minimum is kept.
    """
    known = np.isfinite(target)
    count = len(model.adjustable.value)
    if int(known.sum()) <= count:
        raise ValueError(f"{int(known.sum())} values of ln gamma for {count} parameters")
    limit = LARGEST * float(temperatures.min())
    scale = max(float(np.abs(mixture.pairs.well_depth).max()), 1e-12)

    def residuals(values: Array) -> Array:
        energies = pair_matrix(model, values)
        found = fitted_ln_gamma(model, mixture, energies, temperatures, mole_fractions, z, segment)
        return np.asarray(np.nan_to_num(found[known] - target[known], nan=1e3, posinf=1e3, neginf=-1e3))

    fits = []
    with np.errstate(over="ignore", invalid="ignore", divide="ignore"):
        for start in _starts(model, mixture, z, scale):
            inside = np.clip(start, -0.9 * limit, 0.9 * limit)
            fits.append(
                least_squares(
                    residuals, inside, jac="3-point", bounds=(-limit, limit), x_scale=scale, xtol=1e-12, ftol=1e-14,
                    gtol=1e-14,
                )
            )  # fmt: skip
    best = min(fits, key=lambda fit: float(fit.cost))
    distinct: list[Array] = []
    for fit in fits:
        if fit.success and not any(np.max(np.abs(fit.x - other)) < SAME_MINIMUM * scale for other in distinct):
            distinct.append(fit.x)
    covariance = _covariance(best.jac, best.fun)
    variance = np.diag(covariance)
    errors = np.sqrt(np.where(variance >= 0.0, variance, np.inf))  # not fixed by the data
    correlation = (
        float(covariance[0, 1] / (errors[0] * errors[1]))
        if count == 2 and errors.all() and np.isfinite(errors).all()
        else float("nan")
    )
    return Regression(
        model, np.asarray(best.x), errors, correlation, float(np.sqrt(np.mean(best.fun**2))),
        float(np.max(np.abs(best.fun))), len(distinct),
    )  # fmt: skip


def _starts(model: ActivityModel, mixture: Mixture, z: float, scale: float) -> list[Array]:
    true = true_values(model, mixture)
    rng = np.random.default_rng(SEED)
    several = [rng.normal(0.0, scale, len(true)) for _ in range(RANDOM_STARTS)]
    if model.adjustable is Adjustable.UNLIKE:
        return [true, *(true + 0.3 * step for step in several)]
    return [np.zeros_like(true), true, z / 2.0 * true, *several]


def _covariance(jacobian: Array, residuals: Array) -> Array:
    """s^2 (J^T J)^-1; infinite where the data do not fix a parameter."""
    freedom = max(len(residuals) - jacobian.shape[1], 1)
    try:
        inverse = np.linalg.inv(jacobian.T @ jacobian)
    except np.linalg.LinAlgError:
        return np.full((jacobian.shape[1],) * 2, np.inf)
    return np.asarray(float(residuals @ residuals) / freedom * inverse)
