"""Thousands of damaged files: each is accepted or refused with a message, and nothing else happens."""

from __future__ import annotations

import copy
import math
import random
import tomllib
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from localcomp.calibrate import read_liquid
from localcomp.errors import BadInput
from localcomp.inputs import read_state
from localcomp.study import read_study
from tests.localcomp.state_files import LIQUID, STATE, STUDY, TERNARY

FILES = {
    "state": (STATE, read_state),
    "ternary": (TERNARY, read_state),
    "liquid": (LIQUID, read_liquid),
    "study": (STUDY, read_study),
}
ROUNDS = 4000

TOKENS = [
    b"nan", b"inf", b"-inf", b"-", b"0", b"1e400", b"1e-400", b"9" * 30, b"true", b"[", b"]", b"{", b"}", b'"', b"'",
    b"=", b"\n", b"#", b"[[", b"\x00", b"\xff", b"\xc3", b"\xf0\x9f\x92\xa7", b"1979-05-27", b"0x10", b"_", b".", b",",
    b'"""', b"\\u001b", b"[mixture]", b"[state]", b"[fluid]", b"pairs", b"k = ", b"0.5",
]  # fmt: skip

VALUES: list[Any] = [
    math.nan, math.inf, -math.inf, 0, -0.0, 1, -1, 1e-320, 1e-31, 1e31, 1e308, -1e308, 2**63, 10**400, True, False,
    "", "a", "nan", "rhnc", "reduced", "angstrom", "x" * 5000, "\x1b[31m", [], [[]], {}, {"a": 1}, [1.0], [1.0, 1.5],
    [0.5, 0.5], [0.5, "0.5"], [True, 1.0], [[0.0, 0.1], [0.1, 0.0]], [[0.0, 0.1], [0.2, 0.0]], [[0.0], [0.1, 0.0]],
    ["a", "c"], ["a", "a"], [{}], [None], 0.55, 0.5499999, 4.0, 1.0000001, [1e-30, 1.0], [1e30, 1e30],
]  # fmt: skip


def damaged_bytes(content: bytes, chance: random.Random) -> bytes:
    """A few random edits of the bytes."""
    data = bytearray(content)
    for _ in range(chance.choice([1, 1, 2, 3, 8])):
        at = chance.randrange(len(data) + 1)
        span = chance.choice([1, 1, 2, 5, 20])
        action = chance.randrange(5)
        if action == 0 and at < len(data):
            data[at] = chance.randrange(256)
        elif action == 1:
            del data[at : at + span]
        elif action == 2:
            data[at:at] = chance.choice(TOKENS)
        elif action == 3:
            data[at:at] = data[at : at + span]
        else:
            other = chance.randrange(len(data) + 1)
            data[at : at + span] = data[other : other + span]
    return bytes(data)


def damaged_values(content: dict[str, Any], chance: random.Random) -> dict[str, Any]:
    """The parsed file with a few keys removed, renamed, or given another value."""
    for _ in range(chance.choice([1, 1, 2, 4])):
        holder: Any = content
        while True:
            keys = list(holder) if isinstance(holder, dict) else list(range(len(holder)))
            if not keys:
                break
            key: Any = chance.choice(keys)
            inner = holder[key]
            if isinstance(inner, dict | list) and inner and chance.random() < 0.8:
                holder = inner
                continue
            action = chance.randrange(4)
            if action == 0:
                del holder[key]
            elif action == 1 and isinstance(holder, dict):
                holder[chance.choice([key + "s", key[:-1], key.upper(), "", "k", "density", "pairs"])] = holder.pop(key)
            elif action == 2 and isinstance(inner, float):
                holder[key] = inner * chance.choice([-1, 0, 0.5, 2, 10, 1e10, 1e-10, 1e300, 1e-300])
            else:
                holder[key] = copy.deepcopy(chance.choice(VALUES))
            break
    return content


def as_toml(value: Any, top: bool = True) -> str:
    """TOML text of a dictionary; nested tables are written inline."""
    if isinstance(value, dict):
        pairs = [f"{as_toml(str(key))} = {as_toml(item, False)}" for key, item in value.items()]
        return "\n".join(pairs) + "\n" if top else "{" + ", ".join(pairs) + "}"
    if isinstance(value, list | tuple):
        return "[" + ", ".join(as_toml(item, False) for item in value if item is not None) + "]"
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        shown = "".join(c if c.isprintable() and c not in '"\\' else f"\\u{ord(c):04x}" for c in value)
        return f'"{shown}"'
    return repr(value)


def judge(read: Callable[[Path], Any], path: Path) -> bool:
    """True when the file was accepted, False when it was refused; anything else is a failure."""
    try:
        read(path)
    except BadInput as refusal:
        lines = str(refusal).splitlines()
        assert lines
        assert all(line.startswith(str(path)) and line.isprintable() and len(line) < 1000 for line in lines)
        return False
    return True


@pytest.mark.parametrize("name", FILES)
def test_damaged_bytes(name, tmp_path):
    text, read = FILES[name]
    chance = random.Random(20240 + len(name))
    path = tmp_path / "file.toml"
    accepted = 0
    for _ in range(ROUNDS):
        path.write_bytes(damaged_bytes(text.encode(), chance))
        accepted += judge(read, path)
    assert 0 < accepted < ROUNDS, "the damage must be neither harmless nor total"


@pytest.mark.parametrize("name", FILES)
def test_damaged_values(name, tmp_path):
    text, read = FILES[name]
    chance = random.Random(71 + len(name))
    path = tmp_path / "file.toml"
    accepted = 0
    for _ in range(ROUNDS):
        path.write_text(as_toml(damaged_values(tomllib.loads(text), chance)), encoding="utf-8")
        accepted += judge(read, path)
    assert 0 < accepted < ROUNDS


def test_accepted_states_have_a_density(tmp_path):
    chance = random.Random(5)
    path = tmp_path / "file.toml"
    for _ in range(ROUNDS):
        path.write_text(as_toml(damaged_values(tomllib.loads(STATE), chance)), encoding="utf-8")
        if judge(read_state, path):
            request = read_state(path)
            assert 0.0 < request.mixture.packing_fraction(request.state) < 0.55


@pytest.mark.parametrize("name", FILES)
def test_the_undamaged_file_survives_the_writer(name, tmp_path):
    text, read = FILES[name]
    path = tmp_path / "file.toml"
    path.write_text(as_toml(tomllib.loads(text)), encoding="utf-8")
    assert judge(read, path)


def test_the_judge_fails_a_careless_reader(tmp_path):
    def careless(path: Path) -> object:
        return tomllib.loads(path.read_text(encoding="utf-8"))["mixture"]["diameter"][0] / 0

    path = tmp_path / "file.toml"
    path.write_text(STATE, encoding="utf-8")
    with pytest.raises(ZeroDivisionError):
        judge(careless, path)

    def silent(path: Path) -> object:
        raise BadInput([])

    with pytest.raises(AssertionError):
        judge(silent, path)
