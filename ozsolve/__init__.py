"""Integral equations for mixtures of square-well spheres.

Solves the Ornstein-Zernike equation with the MSA, Percus-Yevick, HNC and reference HNC closures and
gives radial distribution functions, neighbour counts and thermodynamics with error bars.
"""

from ozsolve.closures import CLOSURES, HNC, MSA, PY, RHNC, Closure, get_closure
from ozsolve.errors import InputError, NotConverged, OzsolveError
from ozsolve.many import solve_many
from ozsolve.mixture import Mixture, State
from ozsolve.paths import solve_paths
from ozsolve.potential import PairOverride, PairTable
from ozsolve.sensitivity import Sensitivity, sensitivity
from ozsolve.solution import Solution, Stats
from ozsolve.solver import DEFAULT_ACCURACY, solve
from ozsolve.stopping import Status

__all__ = [
    "CLOSURES",
    "DEFAULT_ACCURACY",
    "HNC",
    "MSA",
    "PY",
    "RHNC",
    "Closure",
    "InputError",
    "Mixture",
    "NotConverged",
    "OzsolveError",
    "PairOverride",
    "PairTable",
    "Sensitivity",
    "Solution",
    "State",
    "Stats",
    "Status",
    "get_closure",
    "sensitivity",
    "solve",
    "solve_many",
    "solve_paths",
]
