"""Requests that would take absurd memory or mean nothing are refused at the door."""

from __future__ import annotations

from pathlib import Path

import pytest

from ozsolve import InputError, Mixture, PairOverride, State, solve
from tests.localcomp.sweeping import run

STATE = """\
[mixture]
names = ["a", "b"]
diameter = [1.0, 1.5]
well_depth = [1.0, 1.5]
{pair}
[state]
temperature = {temperature}
packing_fraction = 0.40
mole_fractions = [0.5, 0.5]
"""


@pytest.mark.parametrize(
    ("pair", "temperature", "part"),
    [
        ("l = 0.9999999", "2.0", "size ratios up to"),
        ('[[mixture.pairs]]\nbetween = ["a", "b"]\ndiameter = 3.6e-10', "2.0", "size ratios up to"),
        ("", "1e-4", "at least 0.015"),
    ],
)
def test_absurd_requests(tmp_path: Path, pair: str, temperature: str, part: str) -> None:
    path = tmp_path / "state.toml"
    path.write_text(STATE.format(pair=pair, temperature=temperature))
    done = run("state", path)
    assert done.returncode == 2
    assert part in done.stderr
    assert "Warning" not in done.stderr


def test_the_same_from_python() -> None:
    with pytest.raises(InputError, match="size ratios"):
        Mixture([1.0, 1.0], [1.0, 1.0], overrides=[PairOverride(0, 1, diameter=0.01)])
    with pytest.raises(InputError, match="wells this deep"):
        solve(Mixture(1.0, 1.0), State(0.001, packing_fraction=0.4))
    wall = solve(Mixture(1.0, -1000.0), State(1.0, packing_fraction=0.1))  # a high shoulder is a larger core
    assert wall.contact_values[0, 0] == 0.0


@pytest.mark.parametrize(
    ("command", "text", "part"),
    [
        ("state", "[fluid]\nname = 'x'\n", "localcomp calibrate"),
        ("state", "[conditions]\ntemperature = 1\n", "localcomp sweep"),
        ("calibrate", "[state]\ntemperature = 1\n", "localcomp state"),
        ("check", "[state]\ntemperature = 1\n", "localcomp state"),
    ],
)
def test_a_file_for_another_command(tmp_path: Path, command: str, text: str, part: str) -> None:
    path = tmp_path / "file.toml"
    path.write_text(text)
    done = run(command, path)
    assert done.returncode == 2
    assert part in done.stderr


def test_failures_in_kelvin_files_speak_of_kelvin(tmp_path: Path) -> None:
    path = tmp_path / "cold.toml"
    path.write_text(
        "[units]\nlength = 'angstrom'\nenergy = 'kelvin'\n[mixture]\ndiameter = [3.4, 3.4]\nwell_depth = [100, 100]\n"
        "k = 0.2\n[state]\ntemperature = 100.0\npacking_fraction = 0.4\nmole_fractions = [0.5, 0.5]\nclosure = 'py'\n"
    )
    done = run("state", path)
    assert done.returncode == 3
    assert "down to T = 135." in done.stderr or "down to T = 136." in done.stderr
    assert "T = 100 K" in done.stderr
    assert "kT" not in done.stderr


def test_a_misspelt_closure_on_the_command_line_gets_a_suggestion(tmp_path: Path) -> None:
    path = tmp_path / "state.toml"
    path.write_text(STATE.format(pair="", temperature="2.0"))
    done = run("state", path, "--closure", "rhnk")
    assert done.returncode == 2
    assert 'did you mean "rhnc"' in done.stderr
