"""Combinatorial parts of ln gamma: what mixing molecules of different size does without attraction."""

from __future__ import annotations

import numpy as np

from localcomp.models.base import Array


def flory_huggins(mole_fractions: Array, volume: Array) -> Array:
    """ln(phi_i/x_i) + 1 - phi_i/x_i with phi_i = x_i r_i/sum x r.

    Parameters
    ----------
    mole_fractions, volume : ndarray, shape (..., s)
        Volumes r_i in any unit.

    Notes
    -----
    Flory, J. Chem. Phys. 10 (1942) 51; Huggins, Ann. N.Y. Acad. Sci. 43 (1942) 1.

    Examples
    --------
    >>> float(flory_huggins(np.array([0.0, 1.0]), np.array([1.0, 2.0]))[0])  # ln(1/2) + 1 - 1/2
    -0.1931471805599453
    """
    share = volume / (mole_fractions * volume).sum(axis=-1, keepdims=True)
    return np.asarray(np.log(share) + 1.0 - share)


def staverman_guggenheim(mole_fractions: Array, volume: Array, surface: Array, z: Array | float) -> Array:
    """Flory-Huggins with Guggenheim's correction for surfaces, -(z/2) q_i [ln(phi_i/theta_i) + 1 - phi_i/theta_i].

    Parameters
    ----------
    mole_fractions, volume, surface : ndarray, shape (..., s)
        Volumes r_i and surfaces q_i, in units of a segment's.
    z : float or ndarray, shape (...)

    Notes
    -----
    Staverman, Rec. Trav. Chim. Pays-Bas 69 (1950) 163; Guggenheim, Mixtures (Oxford, 1952), chapter 10.
    """
    by_volume = volume / (mole_fractions * volume).sum(axis=-1, keepdims=True)
    by_surface = surface / (mole_fractions * surface).sum(axis=-1, keepdims=True)
    ratio = by_volume / by_surface
    half_z = 0.5 * np.asarray(z)[..., None]
    return np.asarray(flory_huggins(mole_fractions, volume) - half_z * surface * (np.log(ratio) + 1.0 - ratio))
