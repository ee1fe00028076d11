"""Derivatives of coordination numbers and energy by a solved state's parameters, one linear solve each."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from ozsolve.equations import Fluid
from ozsolve.errors import InputError
from ozsolve.oz import pair_index
from ozsolve.potential import Array
from ozsolve.response import CENTRAL, FORWARD, STEP, Response
from ozsolve.solution import Solution

PARAMETERS = ("temperature", "well_depth", "k", "density", "mole_fraction")


@dataclass(frozen=True)
class Sensitivity:
    """Derivatives of one solution by one parameter.

    Attributes
    ----------
    parameter : str
    coordination_numbers : ndarray, shape (s, s)
        dN_ij/dp inside the well, row = centre; per unit of the parameter.
    internal_energy : float
        d(U/N)/dp, energy unit per unit of the parameter.
    """

    parameter: str
    coordination_numbers: Array
    internal_energy: float


def sensitivity(solution: Solution, parameter: str, species: tuple[int, ...] = ()) -> Sensitivity:
    """How neighbours and energy answer to a small change, everything else held.

    Parameters
    ----------
    solution : Solution
        A usable one.
    parameter : {"temperature", "well_depth", "k", "density", "mole_fraction"}
        "temperature": T. "well_depth": eps_ij of the pair `species`, other pairs held. "k": k_ij of the pair
        in eps_ij = (1 - k_ij) sqrt(eps_ii eps_jj). "density": ln rho at constant composition.
        "mole_fraction": x_j of the one species named, the others in proportion, at constant packing fraction.
    species : tuple of int
        A pair (i, j) for "well_depth" and "k", one species for "mole_fraction".

    Returns
    -------
    Sensitivity

    Raises
    ------
    InputError
        If the solution failed, or the parameter or the species are not as listed.

    Notes
    -----
    For a parameter p the fixed point x = G(x; p) moves by dx/dp = (I - G')^-1 dG/dp (implicit function theorem).

    Examples
    --------
    >>> from ozsolve import Mixture, State, solve
    >>> s = solve(Mixture([1.0, 1.0], [1.0, 1.0]), State(2.0, (0.5, 0.5), packing_fraction=0.4))
    >>> change = sensitivity(s, "k", (0, 1))  # weaker unlike contacts: fewer unlike neighbours
    >>> bool(change.coordination_numbers[0, 1] < 0 < change.coordination_numbers[0, 0])
    True
    """
    if not solution.status.usable:
        raise InputError("solution", solution.status.value, "a solution that did not fail")
    if parameter not in PARAMETERS:
        raise InputError("parameter", parameter, f"one of: {', '.join(PARAMETERS)}")
    size = solution.mixture.species
    wanted = {"well_depth": 2, "k": 2, "mole_fraction": 1}.get(parameter, 0)
    if len(species) != wanted or not all(0 <= i < size for i in species):
        raise InputError("species", species, f"{wanted} numbers from 0 to {size - 1}")
    if parameter == "k" and species[0] == species[1]:
        raise InputError("species", species, "two different species")
    if parameter == "mole_fraction" and (size < 2 or solution.state.mole_fractions[species[0]] == 1.0):
        raise InputError("species", species, "a species with others to make room for it")
    fluid_at, stencil, scale = _direction(solution, parameter, species)
    level = solution.fine
    response = Response(level.equations, level.x, level.reference, fluid_at, stencil)
    offsets = [STEP * offset for offset, _ in stencil]
    weights = np.array([weight / STEP for _, weight in stencil])
    counts, energies = [], []
    for offset, end in zip(offsets, response.ends(), strict=True):
        moved = fluid_at(offset)
        counts.append(moved.rho[0][None, :] * np.asarray(end.shell_integral))
        temperature = solution.state.temperature * (1.0 + offset if parameter == "temperature" else 1.0)
        energies.append(float(end.energy) * temperature)
    table = np.tensordot(weights, np.array(counts), axes=1) * scale
    table.setflags(write=False)
    return Sensitivity(parameter, table, float(weights @ np.array(energies)) * scale)


def _direction(
    solution: Solution, parameter: str, species: tuple[int, ...]
) -> tuple[Callable[[float], Fluid], tuple[tuple[float, float], ...], float]:
    """The displaced fluid, the stencil, and what turns d/dt into d/dp."""
    fluid = solution.fine.equations.fluid
    if parameter == "temperature":
        return lambda t: fluid.scaled(attraction=1.0 / (1.0 + t)), CENTRAL, 1.0 / solution.state.temperature
    if parameter == "density":
        return lambda t: fluid.scaled(density=1.0 + t), CENTRAL, 1.0
    if parameter == "mole_fraction":
        return _richer_in(solution, species[0])
    i, j = species
    place = int(pair_index(solution.mixture.species)[i][j])

    def deeper(t: float) -> Fluid:
        attraction = fluid.attraction.copy()
        attraction[0, place] += t
        return Fluid(fluid.rho, fluid.core, fluid.edge, attraction)

    if parameter == "well_depth":
        return deeper, CENTRAL, 1.0 / solution.state.temperature
    own = np.diag(solution.mixture.pairs.well_depth)
    if own[i] * own[j] < 0.0:
        raise InputError("species", species, "two wells or two shoulders: others have no geometric mean")
    mean = float(np.sign(own[i]) * np.sqrt(own[i] * own[j]))
    return deeper, CENTRAL, -mean / solution.state.temperature


def _richer_in(
    solution: Solution, chosen: int
) -> tuple[Callable[[float], Fluid], tuple[tuple[float, float], ...], float]:
    """Mole fraction x_j + t (1 - x_j), others shrunk alike, at constant packing fraction."""
    fluid = solution.fine.equations.fluid
    x = np.asarray(solution.state.mole_fractions)
    volume = (solution.mixture.diameter / solution.length) ** 3
    packing = float(np.sum(fluid.rho[0] * volume))
    goal = np.zeros_like(x)
    goal[chosen] = 1.0

    def richer(t: float) -> Fluid:
        moved = x + t * (goal - x)
        rho = moved * packing / float(moved @ volume)
        return Fluid(rho[None, :], fluid.core, fluid.edge, fluid.attraction)

    stencil = CENTRAL if x[chosen] > 2.0 * STEP else FORWARD
    return richer, stencil, 1.0 / (1.0 - float(x[chosen]))
