"""The closures, one small object each: g(gamma), its derivative, name and sources.

A closure says how the radial distribution function outside the core follows from the indirect
correlation gamma = h - c and the reduced well depth B = beta eps (B = 0 beyond the well). Inside the
core g = 0 exactly for every closure. To add one, write an object here and list it in `CLOSURES`;
nothing else changes.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from ozsolve.errors import InputError
from ozsolve.potential import Array


@dataclass(frozen=True)
class BoundClosure:
    """A closure with potential, bridge function and segment weights fixed.

    Attributes
    ----------
    value, slope : callable
        gamma -> weighted g outside the core, and its derivative by gamma; shapes (..., pairs, m).
    """

    value: Callable[[Array], Array]
    slope: Callable[[Array], Array]


class Closure(ABC):
    """How g outside the core follows from gamma.

    Attributes
    ----------
    name : str
        What the user types.
    title : str
        The full name.
    source : str
        Paper that gives the formula.
    needs_reference : bool
        Whether `bridge` (from the Percus-Yevick hard-sphere mixture at the same densities) is used.
    """

    name: str
    title: str
    source: str
    needs_reference: bool = False

    @abstractmethod
    def g(self, gamma: Array, attraction: Array, bridge: Array) -> Array:
        """g outside the core. All arguments broadcast; dimensionless."""

    @abstractmethod
    def g_slope(self, gamma: Array, attraction: Array, bridge: Array) -> Array:
        """d g/d gamma at fixed attraction and bridge."""

    def bind(self, attraction: Array, bridge: Array, well: Array, outside: Array) -> BoundClosure:
        """Fix everything but gamma: the segment-weighted g on a grid, and its derivative by gamma.

        Parameters
        ----------
        attraction : ndarray, shape (..., pairs, 1)
        bridge, well, outside : ndarray, shape (..., pairs, m)
            Bridge function of the reference and the weights of the two segments outside the core.
        """
        zero = np.zeros_like(attraction)
        return BoundClosure(
            lambda gamma: well * self.g(gamma, attraction, bridge) + outside * self.g(gamma, zero, bridge),
            lambda gamma: well * self.g_slope(gamma, attraction, bridge) + outside * self.g_slope(gamma, zero, bridge),
        )

    def __repr__(self) -> str:
        return f"<closure {self.name}>"


class BoltzmannClosure(Closure):
    """A closure in which the step of the potential enters as a factor: g = exp(B + bridge) y(gamma)."""

    @abstractmethod
    def y(self, gamma: Array) -> Array:
        """The cavity function without the bridge factor."""

    @abstractmethod
    def y_slope(self, gamma: Array) -> Array:
        """d y/d gamma."""

    def g(self, gamma: Array, attraction: Array, bridge: Array) -> Array:
        return np.exp(attraction + bridge) * self.y(gamma)

    def g_slope(self, gamma: Array, attraction: Array, bridge: Array) -> Array:
        return np.exp(attraction + bridge) * self.y_slope(gamma)

    def bind(self, attraction: Array, bridge: Array, well: Array, outside: Array) -> BoundClosure:
        mixed = np.exp(bridge) * (well * np.exp(attraction) + outside)
        return BoundClosure(lambda gamma: mixed * self.y(gamma), lambda gamma: mixed * self.y_slope(gamma))


class MeanSpherical(Closure):
    """g = 1 + gamma + B, so that c = B in the well and 0 beyond it."""

    name = "msa"
    title = "mean spherical approximation"
    source = "Lebowitz and Percus, Phys. Rev. 144 (1966) 251"

    def g(self, gamma: Array, attraction: Array, bridge: Array) -> Array:
        return 1.0 + gamma + attraction

    def g_slope(self, gamma: Array, attraction: Array, bridge: Array) -> Array:
        return np.ones_like(gamma)

    def bind(self, attraction: Array, bridge: Array, well: Array, outside: Array) -> BoundClosure:
        both = well + outside
        constant = both + well * attraction
        return BoundClosure(lambda gamma: both * gamma + constant, lambda gamma: np.broadcast_to(both, gamma.shape))


class PercusYevick(BoltzmannClosure):
    """g = exp(B) (1 + gamma)."""

    name = "py"
    title = "Percus-Yevick"
    source = "Percus and Yevick, Phys. Rev. 110 (1958) 1"

    def y(self, gamma: Array) -> Array:
        return 1.0 + gamma

    def y_slope(self, gamma: Array) -> Array:
        return np.ones_like(gamma)


class HypernettedChain(BoltzmannClosure):
    """g = exp(B + gamma)."""

    name = "hnc"
    title = "hypernetted chain"
    source = "van Leeuwen, Groeneveld and de Boer, Physica 25 (1959) 792"

    def y(self, gamma: Array) -> Array:
        return np.exp(gamma)

    def y_slope(self, gamma: Array) -> Array:
        return np.exp(gamma)


class ReferenceHypernettedChain(HypernettedChain):
    """g = exp(B + gamma + b0), b0 = ln(1 + gamma0) - gamma0 of the Percus-Yevick hard-sphere mixture."""

    name = "rhnc"
    title = "reference hypernetted chain"
    source = "Lado, Phys. Rev. A 8 (1973) 2548, with the Percus-Yevick hard-sphere bridge function"
    needs_reference = True


MSA = MeanSpherical()
PY = PercusYevick()
HNC = HypernettedChain()
RHNC = ReferenceHypernettedChain()

CLOSURES: dict[str, Closure] = {closure.name: closure for closure in (MSA, PY, HNC, RHNC)}
"""Every closure by the name the user types."""


def get_closure(closure: str | Closure) -> Closure:
    """The closure object for a name, any case.

    Raises
    ------
    InputError
        If the name is unknown; the message lists the known ones.
    """
    if isinstance(closure, Closure):
        return closure
    found = CLOSURES.get(closure.lower()) if isinstance(closure, str) else None
    if found is None:
        raise InputError("closure", closure, f"known closures: {', '.join(CLOSURES)}")
    return found
