"""Anderson acceleration of a batch of fixed points: frozen settings, explicit state.

With f = G(x) - x and differences of the last `depth` steps dF, dG (newest against the one before),
    theta = argmin |f - dF theta|,   x_next = G(x) - dG theta
(Walker and Ni, SIAM J. Numer. Anal. 49 (2011) 1715, eq. 2.2 with full mixing).
"""

from __future__ import annotations

from collections.abc import Sequence
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
    primed: bool = False

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

    def primed(self, x: Array, memory: Sequence[tuple[Array, Array] | None]) -> History:
        """State for a batch that begins with secant pairs of neighbouring states, (dF, dG) each (up to depth, size).

        They act as Anderson's own until they are overwritten, oldest first. Missing pairs are zero and do nothing.
        """
        history = self.start(x)
        for row, pairs in enumerate(memory):
            if pairs is not None:
                count = min(len(pairs[0]), self.depth)
                history.d_residual[row, self.depth - count :] = pairs[0][-count:]
                history.d_image[row, self.depth - count :] = pairs[1][-count:]
        history.gram = np.matmul(history.d_residual, history.d_residual.transpose(0, 2, 1))
        history.gram[:, range(self.depth), range(self.depth)] *= 1.0 + RIDGE
        history.filled = self.depth
        history.primed = True
        return history

    def step(self, image: Array, residual: Array, history: History) -> Array:
        """The next x from G(x) and G(x) - x, both of shape (b, size)."""
        if history.primed:
            history.primed = False
            following = _extrapolate(image, residual, history, self.depth)
        elif history.filled < 0:
            history.filled = 0
            following = image.copy()
        else:
            slot = history.filled % self.depth
            history.filled += 1
            used = min(history.filled, self.depth)
            one = len(image) == 1
            following = (
                _step_one(image, residual, history, slot, used)
                if one
                else _step_many(image, residual, history, slot, used)
            )
        history.residual = residual
        history.image = image
        return following


def _step_one(image: Array, residual: Array, history: History, slot: int, used: int) -> Array:
    """The step of a single state, in flat arrays: half the time of the batched form."""
    d_residual, d_image, gram = history.d_residual[0], history.d_image[0], history.gram[0]
    np.subtract(residual[0], history.residual[0], out=d_residual[slot])
    np.subtract(image[0], history.image[0], out=d_image[slot])
    seen = d_residual[:used]
    row = seen @ d_residual[slot]
    row[slot] *= 1.0 + RIDGE
    gram[slot, :used] = row
    gram[:used, slot] = row
    _, theta, info = dposv(gram[:used, :used], seen @ residual[0])
    if info != 0:  # a repeated step: nothing to learn from, begin again
        history.filled = 0
        history.restarts += 1
        return image.copy()
    return np.asarray(image - theta @ d_image[:used])


def _step_many(image: Array, residual: Array, history: History, slot: int, used: int) -> Array:
    difference = history.d_residual[:, slot]
    np.subtract(residual, history.residual, out=difference)
    np.subtract(image, history.image, out=history.d_image[:, slot])
    d_residual = history.d_residual[:, :used]
    row = np.matmul(d_residual, difference[:, :, None])[:, :, 0]
    row[:, slot] *= 1.0 + RIDGE
    history.gram[:, slot, :used] = row
    history.gram[:, :used, slot] = row
    return _extrapolate(image, residual, history, used)


def _extrapolate(image: Array, residual: Array, history: History, used: int) -> Array:
    """G - dG theta with the pairs in memory; a singular memory is thrown away."""
    target = np.matmul(history.d_residual[:, :used], residual[:, :, None])
    safe = history.gram[:, :used, :used] + np.finfo(np.float64).tiny * np.eye(used)  # a finished state may stand still
    try:
        theta = np.linalg.solve(safe, target)
    except np.linalg.LinAlgError:
        history.filled = 0
        history.restarts += 1
        return image.copy()
    return np.asarray(image - np.matmul(theta.transpose(0, 2, 1), history.d_image[:, :used])[:, 0])
