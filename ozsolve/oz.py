"""The Ornstein-Zernike relation of a mixture in k space, and the positive-definiteness of I - C(k).

With c the (s, s) matrix of Fourier transforms at one k and D = diag(sqrt(rho)):
    h = c + c rho h                       (the relation; rho = D D)
    C = D c D,  M = I - C                 (symmetric)
    h = c + c D M^-1 D c                  (multiply out the geometric series)
    gamma = h - c = (c D) M^-1 (c D)^T    (no division by a density: dilute species are harmless)
    M = L diag(d) L^T                     (Cholesky without square roots)
    gamma_ij = sum_k Y_ki Y_kj / d_k,  Y = L^-1 (c D)^T
M is positive definite exactly when every pivot d_k is positive. All of it is vectorised over k and
over a batch of states in front; loops run over species only.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from ozsolve.potential import Array, Flags, Indices


@lru_cache(maxsize=16)
def pair_index(species: int) -> tuple[tuple[int, ...], ...]:
    """Symmetric table pair[i][j] of positions in the list (0,0), (0,1), ..., (s-1,s-1)."""
    table = [[0] * species for _ in range(species)]
    position = 0
    for i in range(species):
        for j in range(i, species):
            table[i][j] = table[j][i] = position
            position += 1
    return tuple(tuple(row) for row in table)


@lru_cache(maxsize=16)
def pair_positions(species: int) -> Indices:
    """`pair_index` as a read-only array."""
    positions = np.array(pair_index(species))
    positions.setflags(write=False)
    return positions


def unpack(pairs: Array, species: int) -> Array:
    """From (..., pairs, m) to (..., s, s, m)."""
    return pairs[..., pair_positions(species), :]


def pack(table: Array) -> Array:
    """From a symmetric (..., s, s) table to (..., pairs)."""
    i, j = np.triu_indices(table.shape[-1])
    return table[..., i, j]


def factorise(c_k: Array, root_rho: Array, shift: float = 0.0) -> tuple[list[list[Array]], list[Array]]:
    """L (strictly lower, as rows) and pivots d of (1 - shift) I - C(k).

    Parameters
    ----------
    c_k : ndarray, shape (b, pairs, m)
    root_rho : ndarray, shape (b, s)
        Square roots of the number densities.
    """
    species = root_rho.shape[-1]
    pair = pair_index(species)
    lower: list[list[Array]] = []
    pivots: list[Array] = []
    for i in range(species):
        row: list[Array] = []
        for j in range(i + 1):
            scale = (root_rho[:, i] * root_rho[:, j])[:, None]
            entry = -scale * c_k[:, pair[i][j]]
            if i == j:
                entry += 1.0 - shift
            for m in range(j):
                entry -= row[m] * (lower[j][m] * pivots[m] if j < i else row[m] * pivots[m])
            if j < i:
                row.append(entry / pivots[j])
            else:
                pivots.append(entry)
        lower.append(row)
    return lower, pivots


def indirect(c_k: Array, root_rho: Array) -> tuple[Array, list[Array]]:
    """gamma(k) and the pivots of I - C(k).

    Parameters
    ----------
    c_k : ndarray, shape (b, pairs, m)
        Fourier transforms of the direct correlation functions, reduced volume unit.
    root_rho : ndarray, shape (b, s)

    Returns
    -------
    gamma_k : ndarray, shape (b, pairs, m)
    pivots : list of ndarray, each of shape (b, m)
        All positive exactly where I - C(k) is positive definite.
    """
    species = root_rho.shape[-1]
    if species == 2:
        return _indirect_binary(c_k, root_rho)
    pair = pair_index(species)
    lower, pivots = factorise(c_k, root_rho)
    y: list[list[Array]] = []
    for k in range(species):
        row = []
        for i in range(species):
            entry = root_rho[:, k, None] * c_k[:, pair[i][k]]
            for m in range(k):
                entry -= lower[k][m] * y[m][i]
            row.append(entry)
        y.append(row)
    gamma_k = np.empty_like(c_k)
    scaled = [[y[k][i] / pivots[k] for i in range(species)] for k in range(species)]
    for i in range(species):
        for j in range(i, species):
            total = scaled[0][i] * y[0][j]
            for k in range(1, species):
                total += scaled[k][i] * y[k][j]
            gamma_k[:, pair[i][j]] = total
    return gamma_k, pivots


def _indirect_binary(c_k: Array, root_rho: Array) -> tuple[Array, list[Array]]:
    """The same for two species, multiplied out: a and det/a are the two pivots of the 2 x 2 matrix."""
    rho = root_rho * root_rho
    if len(c_k) == 1:  # plain numbers and flat arrays: a third less time at this size
        gamma_k, pivots = _binary(c_k[0], float(rho[0, 0]), float(rho[0, 1]))
        return gamma_k[None], [pivot[None] for pivot in pivots]
    by_pair, pivots = _binary(c_k.swapaxes(0, 1), rho[:, :1], rho[:, 1:])
    return by_pair.swapaxes(0, 1), pivots


def _binary(c_k: Array, rho_1: Array | float, rho_2: Array | float) -> tuple[Array, list[Array]]:
    """gamma and pivots with the three pairs in front."""
    c_11, c_12, c_22 = c_k
    a = c_11 * -rho_1
    a += 1.0
    d = c_22 * -rho_2
    d += 1.0
    square = c_12 * c_12
    determinant = a * d
    determinant -= square * (rho_1 * rho_2)
    inverse = 1.0 / determinant
    gamma_k = np.empty_like(c_k)
    for slot, other, c, rho_other in ((0, d, c_11, rho_2), (2, a, c_22, rho_1)):
        out = gamma_k[slot]
        np.multiply(other, c, out=out)
        out += square * rho_other
        out *= inverse
        out -= c
    inverse -= 1.0
    np.multiply(c_12, inverse, out=gamma_k[1])
    determinant /= a
    return gamma_k, [a, determinant]


def smallest_pivot(pivots: list[Array]) -> Array:
    """Smallest pivot over all k, shape (b,): positive exactly when I - C(k) is positive definite at every k."""
    return np.asarray(np.min([pivot.min(axis=-1) for pivot in pivots], axis=0))


def indirect_response(h_k: Array, rho: Array, dc_k: Array) -> Array:
    """Change of gamma(k) for a change dc of c(k): d h = (I + h rho) dc (I + rho h), d gamma = d h - dc.

    Differentiate h = c + c rho h and use (I - c rho)^-1 = I + h rho.

    Parameters
    ----------
    h_k, dc_k : ndarray, shape (b, pairs, m)
    rho : ndarray, shape (b, s)
    """
    species = rho.shape[-1]
    pair = pair_index(species)
    factor = [
        [rho[:, j, None] * h_k[:, pair[i][j]] + (1.0 if i == j else 0.0) for j in range(species)]
        for i in range(species)
    ]
    half = [
        [sum_products([(factor[i][m], dc_k[:, pair[m][j]]) for m in range(species)]) for j in range(species)]
        for i in range(species)
    ]
    out = np.empty_like(dc_k)
    for i in range(species):
        for j in range(i, species):
            total = sum_products([(half[i][m], factor[j][m]) for m in range(species)])
            out[:, pair[i][j]] = total - dc_k[:, pair[i][j]]
    return out


def sum_products(terms: list[tuple[Array, Array]]) -> Array:
    """sum of a*b over the terms."""
    first, *rest = terms
    total = first[0] * first[1]
    for a, b in rest:
        total += a * b
    return total


def eigenvalues_above(c_k: Array, root_rho: Array, bound: float) -> Flags:
    """Whether every eigenvalue of I - C(k) exceeds the bound at every k; shape (b,), bool.

    By Cholesky: I - C - bound I is positive definite exactly then.
    """
    _, pivots = factorise(c_k, root_rho, bound)
    return np.asarray(smallest_pivot(pivots) > 0.0)


def lowest_eigenvalue(c_k: Array, root_rho: Array) -> Array:
    """Smallest eigenvalue of I - C(k) over all k, shape (b,); the distance from the stability limit."""
    species = root_rho.shape[-1]
    full = np.moveaxis(unpack(c_k, species), -1, 1)
    scale = root_rho[:, None, :, None] * root_rho[:, None, None, :]
    return np.asarray(np.linalg.eigvalsh(np.eye(species) - scale * full)[..., 0].min(axis=-1))
