"""Fixtures of the application's tests."""

from __future__ import annotations

import sys
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest


@dataclass(frozen=True)
class Ran:
    """How a command ended."""

    status: int
    out: str
    err: str


@pytest.fixture
def write(tmp_path: Path) -> Callable[..., Path]:
    """Write a text into a file of the test's own folder."""

    def writer(text: str, name: str = "state.toml") -> Path:
        path = tmp_path / name
        path.write_text(text, encoding="utf-8")
        return path

    return writer


@pytest.fixture
def run(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> Callable[..., Ran]:
    """Run the command in this process."""
    from localcomp.cli.main import run as entry

    def runner(*words: object) -> Ran:
        monkeypatch.setattr(sys, "argv", ["localcomp", *map(str, words)])
        capsys.readouterr()
        with pytest.raises(SystemExit) as stop:
            entry()
        captured = capsys.readouterr()
        code = stop.value.code
        return Ran(0 if code is None else int(code), captured.out, captured.err)

    return runner
