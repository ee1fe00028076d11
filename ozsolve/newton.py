"""Newton's method with Krylov steps, for the last stretch before the end of a branch.

There the fixed-point map's derivative has an eigenvalue close to 1 and accelerated substitution
crawls; Newton's step uses the exact derivative, and a step that loses the positive definite
I - C(k), or does not shrink the residual, is halved.
"""

from __future__ import annotations

import numpy as np
from scipy.sparse.linalg import ArpackNoConvergence, LinearOperator, eigs, gmres

from ozsolve.equations import Equations
from ozsolve.iteration import Outcome
from ozsolve.oz import smallest_pivot
from ozsolve.potential import Array
from ozsolve.stopping import Status, StoppingRule

MAX_NEWTON = 25
MAX_KRYLOV = 60
FORCING = 0.03
SHORTEST_STEP = 1.0 / 64.0


def newton(equations: Equations, x: Array, rule: StoppingRule) -> Outcome:
    """Iterate one state, x of shape (1, size), to its end."""
    residuals: list[float] = []
    with np.errstate(all="ignore"):
        image, pivots = equations.apply(x)
        residual = image - x
        for _ in range(MAX_NEWTON):
            norm = float(np.abs(residual).max())
            residuals.append(norm)
            if not np.isfinite(norm):
                return Outcome(x, Status.NONFINITE, residuals, equations)
            if norm < rule.tolerance:
                return Outcome(image, Status.SOLVED, residuals, equations)
            direction = solve_linear(equations, x, residual, FORCING)
            length = float(np.linalg.norm(residual))
            size = 1.0
            while True:
                trial = x + size * direction
                image, pivots = equations.apply(trial)
                residual = image - trial
                shrunk = float(np.linalg.norm(residual)) < (1.0 - 1e-4 * size) * length
                if smallest_pivot(pivots)[0] > 0.0 and shrunk:
                    break
                size *= 0.5
                if size < SHORTEST_STEP:
                    return Outcome(x, Status.DIVERGED, residuals, equations)
            x = trial
    return Outcome(x, Status.MAX_STEPS, residuals, equations)


def solve_linear(equations: Equations, x: Array, right: Array, relative: float) -> Array:
    """(I - G'(x))^-1 right by GMRES; shapes as x."""
    product = equations.derivative(x)
    size = x.size

    def matvec(v: Array) -> Array:
        return np.asarray(v - product(v.reshape(x.shape)).reshape(v.shape))

    operator = LinearOperator((size, size), matvec=matvec, dtype=np.float64)
    answer, _ = gmres(operator, right.ravel(), rtol=relative, restart=MAX_KRYLOV, maxiter=2)
    return np.asarray(answer).reshape(x.shape)


def largest_real_eigenvalue(equations: Equations, x: Array) -> float:
    """Largest real eigenvalue of G'(x): 1 where a branch ends, below 1 on the branch before it.

    Complex pairs may lie further right and do no harm. Arnoldi with a fixed start vector, so that the
    same input gives the same answer; infinity when it does not converge (nothing proven).
    """
    product = equations.derivative(x)
    size = x.size
    operator = LinearOperator(
        (size, size), matvec=lambda v: product(v.reshape(x.shape)).reshape(v.shape), dtype=np.float64
    )
    r = equations.grid.r
    start = np.tile(r * np.exp(-0.1 * r), equations.shape[1])
    try:
        values = eigs(operator, k=3, which="LR", v0=start, tol=1e-2, maxiter=20, ncv=30, return_eigenvectors=False)
    except ArpackNoConvergence:
        return np.inf
    real = np.real(values[np.abs(np.imag(values)) < 1e-8])
    return float(real.max(initial=-np.inf))
