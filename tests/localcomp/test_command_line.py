"""The installed command in its own process: help, version, new, calibrate, pipes."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path

import pytest

import localcomp
from tests.localcomp.state_files import LIQUID, STATE, with_line

SCRIPT = Path(sys.executable).parent / "localcomp"


def shell(*words: object, cwd: Path | None = None, **environment: str) -> subprocess.CompletedProcess[str]:
    import os

    return subprocess.run(
        [str(SCRIPT), *map(str, words)], capture_output=True, text=True, cwd=cwd, timeout=120, check=False,
        env={**os.environ, **environment},
    )  # fmt: skip


def test_version():
    ran = shell("--version")
    assert (ran.returncode, ran.stdout.strip()) == (0, f"localcomp {localcomp.__version__}")


def test_help_of_every_command(run):
    listed = run("--help")
    assert listed.status == 0
    for name, words in {
        "new": ["DIR"],
        "state": ["FILE", "--closure", "--accuracy", "--json", "--csv", "--plot", "--compare-closures"],
        "calibrate": ["FILE", "--json"],
    }.items():
        assert name in listed.out
        ran = run(name, "--help")
        assert ran.status == 0
        assert all(word in ran.out for word in words)


@pytest.mark.parametrize(
    ("words", "told"),
    [
        (["state", "f.toml", "--frobnicate"], "--frobnicate"),
        (["calibrate", "f.toml", "--closure", "py"], "--closure"),
        (["state"], "FILE"),
        (["state", "a.toml", "b.toml"], "b.toml"),
        (["stat", "f.toml"], "stat"),
        (["--frobnicate"], "--frobnicate"),
        (["new"], "DIR"),
    ],
)
def test_a_wrong_command_line_is_status_2(words, told):
    ran = shell(*words)
    assert ran.returncode == 2
    assert told in ran.stderr
    assert "Traceback" not in ran.stderr


def test_heavy_modules_wait_until_needed():
    code = "import localcomp, localcomp.cli.main, sys; print(*sys.modules)"
    loaded = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True).stdout.split()
    assert "localcomp.cli.main" in loaded
    assert not {"numpy", "scipy", "matplotlib", "pyfftw", "ozsolve"} & set(loaded)


def test_what_new_writes_runs_as_it_is(tmp_path):
    made = shell("new", "demo", cwd=tmp_path)
    assert made.returncode == 0
    commands = [line.split()[1:] for line in made.stdout.splitlines() if line.startswith("  localcomp ")]
    assert [words[0] for words in commands] == ["state", "calibrate"]
    for words in commands:  # the very lines it suggests
        ran = shell(*words, "--json", cwd=tmp_path)
        assert (ran.returncode, ran.stderr) == (0, "")
        assert json.loads(ran.stdout)["status"] in ("solved", "calibrated")


def test_new_overwrites_nothing(tmp_path, run):
    assert run("new", tmp_path / "a" / "b").status == 0
    mine = tmp_path / "a" / "b" / "liquid.toml"
    mine.write_text("mine")
    (tmp_path / "a" / "b" / "state.toml").unlink()
    ran = run("new", tmp_path / "a" / "b")
    assert ran.status == 2
    assert "not overwritten" in ran.err
    assert mine.read_text() == "mine"
    assert not (tmp_path / "a" / "b" / "state.toml").exists(), "nothing half done"
    assert "is a file" in run("new", mine).err
    assert "cannot be written" in run("new", mine / "x").err
    assert "File name too long" in run("new", tmp_path / (300 * "x")).err


def test_calibrate_in_words_and_in_json(write, run):
    path = write(LIQUID, "liquid.toml")
    body = json.loads(run("calibrate", path, "--json").out)
    assert body["status"] == "calibrated"
    assert body["conditions"]["pressure"]["route"] == "energy"
    spoken = run("calibrate", path)
    assert (spoken.status, spoken.err) == (0, "")
    for words in (f"{body['diameter']:.5f}", f"{body['well_depth']:.4f}", "-5786.00", "101.302", "kPa", "a table"):
        assert words in spoken.out


@pytest.mark.parametrize(
    ("line", "reason"),
    [
        ("residual_energy = -10.0", "too small for a square well"),
        ("residual_energy = -1e5", "too strong for a square well"),
        ("pressure = 1e9", "pressure condition"),
        ("pressure = -1e9", "pressure condition"),
    ],
)
def test_a_liquid_without_answer_is_status_3(line, reason, write, run):
    ran = run("calibrate", write(with_line(LIQUID, line.split(" = ")[0], line)), "--json")
    assert (ran.status, ran.out) == (3, "")
    assert ran.err.startswith("no answer: no square well with range 1.5 reproduces argon at 87.3 K")
    assert reason in ran.err


def test_square_brackets_in_a_liquid_are_text(write, run):
    path = write(with_line(with_line(LIQUID, "name", 'name = "[/i]"'), "source", 'source = "Smith [12], [bold]"'))
    ran = run("calibrate", path)
    assert ran.status == 0
    assert "[/i] at 87.3 K" in ran.out
    assert "Smith [12], [bold]" in ran.out


def test_a_closed_pipe_and_a_plain_terminal_are_no_tragedy(write):
    path = write(STATE)
    process = subprocess.Popen(
        [str(SCRIPT), "state", str(path), "--json"], stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True
    )
    assert process.stdout is not None
    process.stdout.close()
    assert process.stderr is not None
    told = process.stderr.read()
    process.stderr.close()
    process.wait(timeout=60)
    assert told == ""
    plain = shell("state", path, PYTHONIOENCODING="ascii")
    assert plain.returncode == 0
    assert "2.978 ? 0.002" in plain.stdout


def test_help_keeps_its_words(run):
    """Square brackets in help texts would be taken for markup and vanish."""
    assert " a  table" not in run("calibrate", "--help").out
    assert "localcomp new DIR" in run("calibrate", "--help").out
