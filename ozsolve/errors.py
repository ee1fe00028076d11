"""Exceptions of the engine, all derived from `OzsolveError`."""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from ozsolve.solution import Solution


class OzsolveError(Exception):
    """Base class of everything the engine raises on purpose."""


class InputError(OzsolveError, ValueError):
    """An argument is not acceptable.

    Attributes
    ----------
    field : str
        Name of the offending argument.
    value : object
        The value received.
    allowed : str
        What would have been accepted.
    """

    def __init__(self, field: str, value: object, allowed: str) -> None:
        self.field = field
        self.value = value
        self.allowed = allowed
        super().__init__(f"{field} = {value!r} is not allowed; {allowed}")


class NotConverged(OzsolveError):
    """No physical solution was found at the requested state.

    Attributes
    ----------
    solution : Solution
        The failed solution: its status, the sentence that goes with it, the last good point on the
        path and the residual history. Its `gamma_r` is the last good iterate.
    """

    def __init__(self, solution: Solution) -> None:
        self.solution = solution
        super().__init__(solution.message)
