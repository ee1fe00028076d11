"""Derivatives of a solution by implicit differentiation: one linear solve per direction.

For a parameter p the fixed point x = G(x; p) moves by dx/dp = (I - G')^-1 dG/dp. The bridge function
of a reference closure moves with the hard-sphere fluid it is taken from, so that fluid's own response
comes first. dG/dp at fixed x, and numbers read off a solution, are differenced centrally: both are
explicit functions, so the step costs no accuracy worth counting.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from ozsolve.closures import PY
from ozsolve.equations import Equations, Fluid
from ozsolve.newton import solve_linear
from ozsolve.potential import Array
from ozsolve.root import bridge_function
from ozsolve.thermodynamics import Observables, observe

STEP = 1e-4
LINEAR_TOLERANCE = 1e-8


class Response:
    """First-order change of one solved state along one direction in its parameters.

    Parameters
    ----------
    equations : Equations
        Of the solved state.
    x, reference : ndarray, shape (1, size)
        r gamma of the state and of its Percus-Yevick hard-sphere reference.
    fluid_at : callable
        t -> the reduced fluid displaced by t along the direction; `fluid_at(0)` is the solved one.
    """

    def __init__(self, equations: Equations, x: Array, reference: Array, fluid_at: Callable[[float], Fluid]) -> None:
        grid, closure = equations.grid, equations.closure
        forward, backward = fluid_at(STEP), fluid_at(-STEP)
        bridges: tuple[Array | None, Array | None] = (None, None)
        if closure.needs_reference:
            hard = Equations(equations.fluid.scaled(attraction=0.0), grid, PY)
            sides = [Equations(f.scaled(attraction=0.0), grid, PY) for f in (forward, backward)]
            moved = solve_linear(hard, reference, self._map_slope(sides[0], sides[1], reference), LINEAR_TOLERANCE)
            bridges = (
                bridge_function(reference + STEP * moved, sides[0]),
                bridge_function(reference - STEP * moved, sides[1]),
            )
        self._forward = Equations(forward, grid, closure, bridges[0])
        self._backward = Equations(backward, grid, closure, bridges[1])
        slope = self._map_slope(self._forward, self._backward, x)
        self._x = x
        self.dx: Array = solve_linear(equations, x, slope, LINEAR_TOLERANCE)

    @staticmethod
    def _map_slope(forward: Equations, backward: Equations, x: Array) -> Array:
        return np.asarray((forward.apply(x)[0] - backward.apply(x)[0]) / (2.0 * STEP))

    def ends(self) -> tuple[Observables, Observables]:
        """Observables a small step forward and backward (`STEP`), to first order in the solution."""
        return (
            observe(self._forward, self._x + STEP * self.dx),
            observe(self._backward, self._x - STEP * self.dx),
        )

    def slope(self, name: str) -> Array | float:
        """Derivative of the named field of `Observables`, per unit of t."""
        forward, backward = self.ends()
        return (getattr(forward, name) - getattr(backward, name)) / (2.0 * STEP)  # type: ignore[no-any-return]


def density_derivatives(equations: Equations, x: Array, reference: Array) -> tuple[float, float]:
    """Derivatives by the density at constant composition and temperature.

    Returns
    -------
    inverse_compressibility : float
        d(rho Z)/d rho of the virial route; with the compressibility route's own number it makes the
        gap between routes.
    energy_slope : float
        d(U/(N kT))/d ln rho.
    """
    fluid = equations.fluid
    response = Response(equations, x, reference, lambda t: fluid.scaled(density=1.0 + t))
    forward, backward = response.ends()
    inverse = ((1.0 + STEP) * forward.virial - (1.0 - STEP) * backward.virial) / (2.0 * STEP)
    return float(inverse), float((forward.energy - backward.energy) / (2.0 * STEP))
