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
from ozsolve.oz import pair_index
from ozsolve.potential import Array
from ozsolve.root import bridge_function
from ozsolve.thermodynamics import Observables, observe

STEP = 1e-4
LINEAR_TOLERANCE = 1e-8
CENTRAL = ((-1.0, -0.5), (1.0, 0.5))
"""(offset in steps, weight over the step) of the central difference, second order."""
FORWARD = ((0.0, -1.5), (1.0, 2.0), (2.0, -0.5))
"""The same for a parameter that cannot be decreased: a density of zero."""


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
    stencil : CENTRAL or FORWARD
        Offsets and weights of the explicit differences.
    """

    def __init__(
        self,
        equations: Equations,
        x: Array,
        reference: Array,
        fluid_at: Callable[[float], Fluid],
        stencil: tuple[tuple[float, float], ...] = CENTRAL,
    ) -> None:
        grid, closure = equations.grid, equations.closure
        self._offsets = [STEP * offset for offset, _ in stencil]
        self._weights = [weight / STEP for _, weight in stencil]
        fluids = [fluid_at(offset) for offset in self._offsets]
        bridges: list[Array | None] = [None] * len(fluids)
        if closure.needs_reference:
            hard = Equations(equations.fluid.scaled(attraction=0.0), grid, PY)
            sides = [Equations(f.scaled(attraction=0.0), grid, PY) for f in fluids]
            moved = solve_linear(hard, reference, self._map_slope(sides, reference), LINEAR_TOLERANCE)
            bridges = [
                bridge_function(reference + offset * moved, side)
                for offset, side in zip(self._offsets, sides, strict=True)
            ]
        self._sides = [Equations(f, grid, closure, b) for f, b in zip(fluids, bridges, strict=True)]
        self._x = x
        self.dx: Array = solve_linear(equations, x, self._map_slope(self._sides, x), LINEAR_TOLERANCE)

    def _map_slope(self, sides: list[Equations], x: Array) -> Array:
        images = (side.apply(x)[0] for side in sides)
        return np.asarray(sum(weight * image for weight, image in zip(self._weights, images, strict=True)))

    def ends(self) -> list[Observables]:
        """Observables at the stencil's offsets (`CENTRAL`: backward, forward), to first order in the solution."""
        return [
            observe(side, self._x + offset * self.dx) for offset, side in zip(self._offsets, self._sides, strict=True)
        ]

    def slope(self, name: str) -> Array | float:
        """Derivative of the named field of `Observables`, per unit of t."""
        values = np.array([getattr(end, name) for end in self.ends()])
        found = np.tensordot(self._weights, values, axes=1)
        return float(found) if found.ndim == 0 else np.asarray(found)


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
    backward, forward = response.ends()
    inverse = ((1.0 + STEP) * forward.virial - (1.0 - STEP) * backward.virial) / (2.0 * STEP)
    return float(inverse), float((forward.energy - backward.energy) / (2.0 * STEP))


def partial_energies(equations: Equations, x: Array, reference: Array) -> Array:
    """d(U/V)/d rho_j at constant temperature and volume, in kT: what one more particle of species j adds.

    Its integral over beta is the attraction part of beta mu_j (thermodynamics: mu_j = dA/dN_j and
    beta A = int U d beta). A species at zero density is added one-sidedly.

    Returns
    -------
    ndarray, shape (s,)
    """
    fluid = equations.fluid
    species = fluid.rho.shape[1]
    like = [pair_index(species)[j][j] for j in range(species)]
    packing = float(np.sum(fluid.rho[0] * fluid.core[0, like] ** 3))
    total = float(fluid.rho.sum())
    energy = float(observe(equations, x).energy)
    out = np.empty(species)
    for j in range(species):
        unit = packing / fluid.core[0, like[j]] ** 3  # density of pure j as densely packed
        stencil = CENTRAL if fluid.rho[0, j] > 2.0 * STEP * unit else FORWARD

        def displaced(t: float, j: int = j, unit: float = unit) -> Fluid:
            rho = fluid.rho.copy()
            rho[0, j] += t * unit
            return Fluid(rho, fluid.core, fluid.edge, fluid.attraction)

        response = Response(equations, x, reference, displaced, stencil)
        out[j] = energy + total * float(response.slope("energy")) / unit  # U/V = total * U/N
    return out
