"""Anderson acceleration of a batch of fixed points: frozen settings, explicit state.

With f = G(x) - x and differences of the last `depth` steps dF, dG (newest against the one before),
    theta = argmin |f - dF theta|,   x_next = G(x) - dG theta
(Walker and Ni, SIAM J. Numer. Anal. 49 (2011) 1715, eq. 2.2 with full mixing).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.linalg.lapack import dposv

from ozsolve.potential import Array, Indices

RIDGE = 1e-14
"""Relative ridge on the small normal matrix: below the squared round-off of its entries."""


@dataclass
class History:
    """Run state of one accelerated batch; shapes (b, depth, size), (b, depth, depth), (b, size)."""

    d_residual: Array
    d_image: Array
    gram: Array
    residual: Array
    image: Array
    filled: int = 0
    restarts: int = 0

    def keep(self, rows: Indices) -> None:
        """Drop the states of the batch that are not listed."""
        for name in ("d_residual", "d_image", "gram", "residual", "image"):
            setattr(self, name, getattr(self, name)[rows])


class Recycled:
    """Secant pairs of a neighbouring state, put in front of the map as a fixed preconditioner.

    The neighbour's differences say how its map acts on the directions that converge slowly; those
    directions are much the same here. x + f is replaced by x + f - dG theta with theta fitted to f by
    the neighbour's dF: Anderson's own step with a frozen memory.

    Parameters
    ----------
    d_residual, d_image : ndarray, shape (depth, size)
    """

    def __init__(self, d_residual: Array, d_image: Array) -> None:
        left, singular, right = np.linalg.svd(d_residual, full_matrices=False)
        keep = singular > RECYCLED_CUT * singular[0]
        self._directions = np.ascontiguousarray(right[keep].T)
        self._images = (left[:, keep] / singular[keep]).T @ d_image

    def correct(self, image: Array, residual: Array) -> Array:
        """The preconditioned image for a batch, shape (b, size)."""
        return np.asarray(image - (residual @ self._directions) @ self._images)


RECYCLED_CUT = 1e-7
"""Directions seen only below this share of the largest difference are noise."""


@dataclass(frozen=True)
class Anderson:
    """Settings of the accelerator.

    Attributes
    ----------
    depth : int
        Remembered steps.
    """

    depth: int = 8

    def start(self, x: Array) -> History:
        """Fresh state for a batch x of shape (b, size)."""
        batch, size = x.shape
        shape = (batch, self.depth, size)
        return History(
            np.zeros(shape),
            np.zeros(shape),
            np.zeros((batch, self.depth, self.depth)),
            np.zeros((batch, size)),
            np.zeros((batch, size)),
            filled=-1,
        )

    def step(self, image: Array, residual: Array, history: History) -> Array:
        """The next x from G(x) and G(x) - x, both of shape (b, size)."""
        if history.filled < 0:
            history.filled = 0
            following = image.copy()
        else:
            slot = history.filled % self.depth
            difference = history.d_residual[:, slot]
            np.subtract(residual, history.residual, out=difference)
            np.subtract(image, history.image, out=history.d_image[:, slot])
            history.filled += 1
            used = min(history.filled, self.depth)
            d_residual = history.d_residual[:, :used]
            row = np.matmul(d_residual, difference[:, :, None])[:, :, 0]
            row[:, slot] *= 1.0 + RIDGE
            history.gram[:, slot, :used] = row
            history.gram[:, :used, slot] = row
            target = np.matmul(d_residual, residual[:, :, None])
            theta = _solve_small(history.gram[:, :used, :used], target)
            if theta is None:  # a repeated step: nothing to learn from, begin again
                history.filled = 0
                history.restarts += 1
                following = image.copy()
            else:
                following = image - np.matmul(theta.transpose(0, 2, 1), history.d_image[:, :used])[:, 0]
        history.residual = residual
        history.image = image
        return following


def _solve_small(gram: Array, target: Array) -> Array | None:
    """gram^-1 target for a stack of small positive definite matrices; None when one is singular."""
    if len(gram) == 1:  # one state: the LAPACK routine itself, a quarter of the time of a stacked solve
        _, theta, info = dposv(gram[0], target[0])
        return theta[None] if info == 0 else None
    try:
        safe = gram + np.finfo(np.float64).tiny * np.eye(gram.shape[-1])  # a finished state may stand still
        return np.asarray(np.linalg.solve(safe, target), dtype=np.float64)
    except np.linalg.LinAlgError:
        return None
