"""Reading TOML tables with every mistake named: file, key, value, what is allowed."""

from __future__ import annotations

import difflib
import math
import tomllib
from collections.abc import Callable, Iterable
from pathlib import Path
from typing import Any

from localcomp.errors import BadInput, Problem

LARGEST_FILE = 4 * 1024 * 1024


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
        if path.exists() and path.stat().st_size > LARGEST_FILE:
            raise fail(f"is larger than {LARGEST_FILE // 1024**2} MiB; a state file has a few lines")
        raw = path.read_bytes()
    except FileNotFoundError:
        near = _nearest(path.name, [p.name for p in _siblings(path)])
        raise fail(f"no such file{near}") from None
    except (OSError, ValueError) as error:
        raise fail(f"cannot be read ({getattr(error, 'strerror', None) or error})") from None
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


def _nearest(name: str, known: Iterable[str]) -> str:
    match = difflib.get_close_matches(name, list(known), n=1, cutoff=0.6)
    return f'; did you mean "{match[0]}"?' if match else ""


def show(value: object) -> str:
    """A value as it may appear in a message: short."""
    text = repr(value)
    return text if len(text) <= 60 else text[:57] + "..."


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
                near = _nearest(key, allowed)
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
        value = as_number(self.content[key])
        if value is None or not accept(value):
            self._add(key, self.content[key], allowed)
            return None
        return value

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
            value = as_number(raw)
            if value is None or not accept(value):
                self._add(key, raw, allowed)
                return None
            return [value] * (size or 1)
        if not isinstance(raw, list) or not raw:
            self._add(key, raw, allowed)
            return None
        values = [as_number(item) for item in raw]
        if any(v is None or not accept(v) for v in values):
            self._add(key, raw, allowed)
            return None
        if size is not None and len(values) != size:
            self._add(key, raw, f"{allowed}; {size} of them, one per species, not {len(values)}")
            return None
        return [v for v in values if v is not None]

    def word(self, key: str, choices: Iterable[str], default: str) -> str:
        """One of a few words, any case."""
        options = list(choices)
        value = self.content.get(key, default)
        if not isinstance(value, str) or value.lower() not in options:
            near = _nearest(value.lower(), options) if isinstance(value, str) else ""
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


def as_number(value: object) -> float | None:
    """A finite float from a TOML integer or float; None otherwise (booleans are not numbers)."""
    if isinstance(value, bool) or not isinstance(value, int | float):
        return None
    try:
        number = float(value)
    except OverflowError:
        return None
    return number if math.isfinite(number) else None
