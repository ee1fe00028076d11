"""Reading TOML tables with every mistake named: file, key, value, what is allowed."""

from __future__ import annotations

import difflib
import math
import tomllib
from collections.abc import Callable, Iterable
from pathlib import Path
from typing import Any

from localcomp.errors import BadInput, Problem

LARGEST_FILE = 64 * 1024
"""Bytes; the TOML parser's time can grow with the square of the size."""
SMALLEST_NUMBER, LARGEST_NUMBER = 1e-30, 1e30
"""Sizes of numbers in files: their cubes and quotients stay finite, SI units of molecules included."""
SIZE_LIMITS = f"; in size between {SMALLEST_NUMBER:g} and {LARGEST_NUMBER:g}"
LONGEST_SHOWN = 60


def load_toml(path: Path) -> dict[str, Any]:
    """Parse a TOML file.

    Raises
    ------
    BadInput
        If it is missing, a directory, unreadable, too large, not text, empty, or not TOML.
    """
    name = str(path)

    def fail(allowed: str) -> BadInput:
        return BadInput([Problem(name, "", "", allowed)])

    try:
        if path.is_dir():
            raise fail("is a directory; name a TOML file")
        with path.open("rb") as stream:  # a bounded read: devices and pipes have no size to ask for
            raw = stream.read(LARGEST_FILE + 1)
    except FileNotFoundError:
        near = nearest(path.name, [p.name for p in _siblings(path)])
        raise fail(f"no such file{near}") from None
    except (OSError, ValueError) as error:
        raise fail(f"cannot be read ({getattr(error, 'strerror', None) or error})") from None
    if len(raw) > LARGEST_FILE:
        raise fail(f"is larger than {LARGEST_FILE // 1024} KiB; a state file has a few lines")
    if not raw.strip():
        raise fail("is empty; `localcomp new DIR` writes a file to start from")
    try:
        text = raw.decode("utf-8-sig")
    except UnicodeDecodeError:
        raise fail("is not a text file (TOML is UTF-8 text)") from None
    try:
        return tomllib.loads(text.replace("\r\n", "\n"))
    except tomllib.TOMLDecodeError as error:
        raise fail(f"is not valid TOML: {error}") from None
    except (RecursionError, ValueError) as error:
        raise fail(f"is not valid TOML: {type(error).__name__}") from None


def _siblings(path: Path) -> list[Path]:
    try:
        return list(path.parent.iterdir())
    except OSError:
        return []


def nearest(name: str, known: Iterable[str]) -> str:
    """A question after the nearest known name, or nothing when none is near."""
    match = difflib.get_close_matches(name, list(known), n=1, cutoff=0.6)
    return f'; did you mean "{match[0]}"?' if match else ""


def show(value: object) -> str:
    """A value as it may appear in a message: short, on one line."""
    try:
        return _shortened(repr(value))
    except (ValueError, RecursionError):  # integers of thousands of digits, tables nested thousands deep
        return f"a {type(value).__name__} too long to show"


def _shortened(text: str) -> str:
    return text if len(text) <= LONGEST_SHOWN else text[: LONGEST_SHOWN - 3] + "..."


class Table:
    """One TOML table being read; mistakes are collected, not raised.

    Parameters
    ----------
    file : str
    name : str
        As written in the file, e.g. "state"; "" for the top level.
    content : object
        What stands there.
    problems : list of Problem
        Where mistakes go; shared by all tables of a file.
    """

    def __init__(self, file: str, name: str, content: object, problems: list[Problem]) -> None:
        self.file = file
        self.name = name
        self.problems = problems
        self.content: dict[str, Any] = {}
        if isinstance(content, dict):
            self.content = content
        else:
            self._add("", content, "must be a table of keys")

    def _add(self, key: str, value: object, allowed: str, *, shown: bool = True) -> None:
        key = _shortened(key if key.isprintable() else repr(key))
        where = f"[{self.name}] {key}".strip() if self.name else key
        self.problems.append(Problem(self.file, where, show(value) if shown else "", allowed))

    def complain(self, key: str, value: object, allowed: str) -> None:
        """Record a mistake found by the caller."""
        self._add(key, value, allowed)

    def known(self, keys: Iterable[str]) -> None:
        """Complain about every key not listed, suggesting the nearest."""
        allowed = list(keys)
        for key, value in self.content.items():
            if key not in allowed:
                near = nearest(key, allowed)
                self._add(key, value, f"unknown key{near or '; known: ' + ', '.join(allowed)}")

    def missing(self, key: str, allowed: str) -> None:
        """Complain that a needed key is not there."""
        self._add(key, None, f"is missing: {allowed}", shown=False)

    def number(
        self, key: str, allowed: str, accept: Callable[[float], bool], *, default: float | None = None
    ) -> float | None:
        """A finite number, or the default; None after a complaint."""
        if key not in self.content:
            if default is None:
                self.missing(key, allowed)
            return default
        values = self._accepted(key, [self.content[key]], allowed, accept)
        return None if values is None else values[0]

    def optional_number(self, key: str, allowed: str, accept: Callable[[float], bool]) -> float | None:
        """A number if the key is there."""
        return self.number(key, allowed, accept) if key in self.content else None

    def numbers(
        self, key: str, allowed: str, accept: Callable[[float], bool], *, size: int | None, scalar: bool = False
    ) -> list[float] | None:
        """A list of finite numbers, of the given size when known; a single number when `scalar`."""
        if key not in self.content:
            self.missing(key, allowed)
            return None
        raw = self.content[key]
        if scalar and not isinstance(raw, list):
            values = self._accepted(key, [raw], allowed, accept)
            return None if values is None else values * (size or 1)
        if not isinstance(raw, list) or not raw:
            self._add(key, raw, allowed)
            return None
        values = self._accepted(key, raw, allowed, accept)
        if values is not None and size is not None and len(values) != size:
            self._add(key, raw, f"{allowed}; {size} of them, one per species, not {len(values)}")
            return None
        return values

    def _accepted(
        self, key: str, items: list[Any], allowed: str, accept: Callable[[float], bool]
    ) -> list[float] | None:
        """All items as numbers, or None after a complaint."""
        numbers = [number for number in map(as_number, items) if number is not None and accept(number)]
        if len(numbers) < len(items):
            self._add(key, self.content[key], allowed)
            return None
        if not all(map(of_usable_size, numbers)):
            self._add(key, self.content[key], allowed + SIZE_LIMITS)
            return None
        return numbers

    def word(self, key: str, choices: Iterable[str], default: str) -> str:
        """One of a few words, any case."""
        options = list(choices)
        value = self.content.get(key, default)
        if not isinstance(value, str) or value.lower() not in options:
            near = nearest(value.lower(), options) if isinstance(value, str) else ""
            self._add(key, value, f"one of: {', '.join(options)}{near}")
            return default
        return value.lower()

    def text(self, key: str, default: str) -> str:
        """A line of text."""
        value = self.content.get(key, default)
        if not isinstance(value, str) or not value.strip() or len(value) > 200 or not value.isprintable():
            self._add(key, value, "must be a short line of text")
            return default
        return value


def of_usable_size(number: float) -> bool:
    """Whether a number is zero or neither tiny nor huge."""
    return number == 0.0 or SMALLEST_NUMBER <= abs(number) <= LARGEST_NUMBER


def as_number(value: object) -> float | None:
    """A finite float from a TOML integer or float; None otherwise (booleans are not numbers)."""
    if isinstance(value, bool) or not isinstance(value, int | float):
        return None
    try:
        number = float(value)
    except OverflowError:
        return None
    return number if math.isfinite(number) else None
