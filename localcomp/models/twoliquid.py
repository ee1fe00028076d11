"""The logarithm that Wilson's, UNIQUAC's and the lattice-surface excess functions share."""

from __future__ import annotations

import numpy as np

from localcomp.models.base import Array


def local_logarithm(fractions: Array, factors: Array) -> Array:
    """1 - ln s_i - sum_k f_k B_ki/s_k with s_i = sum_j f_j B_ij: the derivative of -sum_k n_k ln s_k by n_i.

    Parameters
    ----------
    fractions : ndarray, shape (..., s)
        Mole fractions (Wilson) or surface fractions (UNIQUAC).
    factors : ndarray, shape (..., s, s)
        B_ij, row = centre: Wilson's Lambda_ij, UNIQUAC's tau_ji.
    """
    total = (factors * fractions[..., None, :]).sum(axis=-1)
    share = (fractions / total)[..., :, None] * factors
    return np.asarray(1.0 - np.log(total) - share.sum(axis=-2))
