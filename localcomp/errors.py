"""Exceptions of the application: every one has a message a user can act on."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass


class LocalcompError(Exception):
    """Base class of everything `localcomp` raises on purpose."""


@dataclass(frozen=True)
class Problem:
    """One mistake in one file.

    Attributes
    ----------
    file : str
    key : str
        "[table] key", or "" when the whole file is meant.
    value : str
        What was found, as text; "" when nothing was.
    allowed : str
        What is allowed there, with the nearest name when a name was misspelt.
    """

    file: str
    key: str
    value: str
    allowed: str

    def __str__(self) -> str:
        where = f"{self.file}: {self.key}" if self.key else self.file
        found = f" = {self.value}" if self.value else ""
        return f"{where}{found}: {self.allowed}"


class BadInput(LocalcompError):
    """A file or an argument is not acceptable; carries every mistake found.

    Attributes
    ----------
    problems : tuple of Problem
    """

    def __init__(self, problems: Sequence[Problem]) -> None:
        self.problems = tuple(problems)
        super().__init__("\n".join(str(problem) for problem in self.problems))


class NoAnswer(LocalcompError):
    """The question is well put but has no answer; the message says why."""
