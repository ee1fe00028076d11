"""State files: every mistake named, nothing but `BadInput` ever, units."""

from __future__ import annotations

import math
import random
import subprocess
from pathlib import Path

import pytest

from localcomp.calibrate import read_liquid
from localcomp.errors import BadInput
from localcomp.inputs import read_state
from localcomp.study import read_study
from localcomp.templates import LIQUID_TOML, STATE_TOML, STUDY_TOML
from localcomp.units import Units, density_from_molar_volume, molar_volume_from_density
from tests.localcomp.sweeping import command

GOOD = """\
[mixture]
names = ["a", "b"]
diameter = [1.0, 1.5]
well_depth = [1.0, 1.5]
well_range = 1.5
k = 0.1
[state]
temperature = 2.0
packing_fraction = 0.40
mole_fractions = [0.5, 0.5]
closure = "msa"
"""


def changed(old: str, new: str) -> str:
    assert old in GOOD
    return GOOD.replace(old, new)


BAD: dict[str, tuple[str, list[str]]] = {
    "missing table": ("[mixture]\ndiameter = [1.0]\nwell_depth = [1.0]\n", ["[state]", "is needed"]),
    "missing key": (changed("temperature = 2.0\n", ""), ["[state] temperature", "is missing"]),
    "misspelt key": (changed("temperature", "temprature"), ["temprature", 'did you mean "temperature"']),
    "misspelt table": (changed("[state]", "[stat]"), ["stat", 'did you mean "state"']),
    "extra key": (changed("k = 0.1", "k = 0.1\ncolour = 3"), ["[mixture] colour", "unknown key"]),
    "text for a number": (changed("2.0", '"warm"'), ["temperature", "'warm'", "positive number"]),
    "boolean for a number": (changed("temperature = 2.0", "temperature = true"), ["temperature", "True"]),
    "number for a list": (changed("[1.0, 1.5]\nwell_depth", "1.0\nwell_depth"), ["[mixture] diameter"]),
    "nested list": (changed("diameter = [1.0, 1.5]", "diameter = [[1.0], [1.5]]"), ["[mixture] diameter"]),
    "table for a number": (changed("temperature = 2.0", "temperature = { a = 1 }"), ["temperature"]),
    "not a number": (changed("2.0", "nan"), ["temperature", "nan"]),
    "infinity": (changed("well_depth = [1.0, 1.5]", "well_depth = [1.0, inf]"), ["well_depth", "inf"]),
    "huge integer": (changed("2.0", "1" + "0" * 400), ["temperature"]),
    "negative size": (changed("diameter = [1.0, 1.5]", "diameter = [1.0, -1.5]"), ["diameter", "positive"]),
    "zero size": (changed("diameter = [1.0, 1.5]", "diameter = [0.0, 1.5]"), ["diameter", "positive"]),
    "size ratio": (changed("diameter = [1.0, 1.5]", "diameter = [1.0, 99.0]"), ["diameter", "size ratios up to"]),
    "fractions": (changed("[0.5, 0.5]", "[0.5, 0.6]"), ["mole_fractions", "must sum to 1", "1.1"]),
    "fraction outside": (changed("[0.5, 0.5]", "[-0.5, 1.5]"), ["mole_fractions", "[0, 1]"]),
    "too few fractions": (changed("[0.5, 0.5]", "[1.0]"), ["mole_fractions", "2 of them"]),
    "too dense": (changed("0.40", "0.55"), ["packing_fraction", "(0, 0.55)"]),
    "empty space": (changed("0.40", "0.0"), ["packing_fraction", "(0, 0.55)"]),
    "two densities": (changed("0.40", "0.40\ndensity = 0.3"), ["packing_fraction and density", "exactly one"]),
    "no density": (changed("packing_fraction = 0.40\n", ""), ["packing_fraction", "exactly one"]),
    "dense by density": (changed("packing_fraction = 0.40", "density = 3.0"), ["density", "packing fraction"]),
    "range": (changed("well_range = 1.5", "well_range = 1.0"), ["well_range", "larger than 1"]),
    "asymmetric k": (changed("k = 0.1", "k = [[0.0, 0.1], [0.2, 0.0]]"), ["[mixture] k", "symmetric"]),
    "k on the diagonal": (changed("k = 0.1", "k = [[0.1, 0.1], [0.1, 0.0]]"), ["[mixture] k", "zero diagonal"]),
    "k of wrong shape": (changed("k = 0.1", "k = [[0.0]]"), ["[mixture] k", "2 x 2"]),
    "ragged k": (changed("k = 0.1", "k = [[0.0, 0.1], [0.1]]"), ["[mixture] k"]),
    "cold": (changed("2.0", "0.0"), ["temperature", "positive"]),
    "below zero": (changed("2.0", "-3"), ["temperature", "-3"]),
    "closure": (changed('"msa"', '"mas"'), ["closure", "'mas'", "msa, py, hnc, rhnc", 'did you mean "msa"']),
    "names": (changed('["a", "b"]', '["a", "a"]'), ["names", "2 different names"]),
    "species": (changed("well_depth = [1.0, 1.5]", "well_depth = [1.0]"), ["well_depth", "2 of them"]),
    "well meets shoulder": (changed("well_depth = [1.0, 1.5]", "well_depth = [1.0, -1.5]"), ["geometric mean"]),
    "volume without unit": (changed("packing_fraction = 0.40", "molar_volume = 30.0"), ["molar_volume", "angstrom"]),
    "unit": (GOOD + '[units]\nlength = "metre"\n', ["[units] length", "reduced, angstrom"]),
    "shell rule": (GOOD + '[shell]\nrule = "edge"\n', ["[shell] rule", "well_edge"]),
    "unused multiple": (GOOD + "[shell]\nmultiple = 1.4\n", ["[shell] multiple", "only used with"]),
    "accuracy": (GOOD + "[numerics]\naccuracy = 1.0\n", ["[numerics] accuracy", "1e-10"]),
    "pair of a stranger": (GOOD + '[[mixture.pairs]]\nbetween = ["a", "c"]\n', ["between", "two different species"]),
    "pair twice": (GOOD + '[[mixture.pairs]]\nbetween = ["a", "b"]\n' * 2, ["given twice"]),
    "pair range": (GOOD + '[[mixture.pairs]]\nbetween = ["a", "b"]\nwell_range = 0.5\n', ["well_range"]),
    "pairs not tables": (changed("k = 0.1", "pairs = 3"), ["pairs", "[[mixture.pairs]]"]),
    "mixture not a table": ("mixture = 3\n[state]\ntemperature = 1\n", ["[mixture]", "must be a table"]),
    "not TOML": ("this is not toml", ["is not valid TOML", "line 1"]),
    "deep nesting": ("a = " + "[" * 5000 + "]" * 5000, ["is not valid TOML"]),
    "empty": ("", ["is empty"]),
    "blank": ("  \n\t\n", ["is empty"]),
}


def written(tmp_path: Path, text: str) -> Path:
    path = tmp_path / "state.toml"
    path.write_text(text, encoding="utf-8")
    return path


@pytest.mark.parametrize("name", list(BAD))
def test_mistakes_are_named(tmp_path: Path, name: str) -> None:
    text, parts = BAD[name]
    with pytest.raises(BadInput) as caught:
        read_state(written(tmp_path, text))
    message = str(caught.value)
    assert "state.toml" in message
    for part in parts:
        assert part in message


def test_all_mistakes_come_at_once(tmp_path: Path) -> None:
    text = changed("2.0", "-1").replace("well_range", "well_rnage").replace('"msa"', '"x"')
    with pytest.raises(BadInput) as caught:
        read_state(written(tmp_path, text))
    assert len(caught.value.problems) == 3


def test_odd_files(tmp_path: Path) -> None:
    for path, part in ((tmp_path / "absent.toml", "no such file"), (tmp_path, "is a directory")):
        with pytest.raises(BadInput, match=part):
            read_state(path)
    binary = tmp_path / "binary.toml"
    binary.write_bytes(bytes(range(256)) * 4)
    with pytest.raises(BadInput, match="not a text file"):
        read_state(binary)
    large = tmp_path / "large.toml"
    large.write_bytes(b"#" * 5_000_000)
    with pytest.raises(BadInput, match="larger than"):
        read_state(large)
    written(tmp_path, GOOD)
    with pytest.raises(BadInput, match=r'did you mean "state.toml"'):
        read_state(tmp_path / "stat.toml")


@pytest.mark.parametrize("name", ["missing key", "misspelt key", "closure", "empty", "not TOML", "fractions"])
def test_the_command_says_it_with_status_two(tmp_path: Path, name: str) -> None:
    text, parts = BAD[name]
    done = subprocess.run(
        command("state", written(tmp_path, text)), capture_output=True, text=True, timeout=60, check=False
    )
    assert done.returncode == 2
    assert done.stdout == ""
    assert "Traceback" not in done.stderr
    for part in parts:
        assert part in done.stderr


def mutated(text: str, rng: random.Random) -> bytes:
    """A valid file with a few bytes, values or lines changed."""
    kind = rng.randrange(4)
    if kind == 0:
        raw = bytearray(text.encode())
        for _ in range(rng.randrange(1, 6)):
            raw[rng.randrange(len(raw))] = rng.randrange(256)
        return bytes(raw)
    lines = text.splitlines()
    if kind == 1:
        del lines[rng.randrange(len(lines))]
        rng.shuffle(lines)
    else:
        values = [
            "-1", "0", "nan", "inf", "1e999", "true", '""', '"x"', "[]", "[[1]]", "{}", "1979-05-27", "[1, 'a']",
            "1" + "0" * 320, "{ from = 1, to = nan, steps = 3 }", "[0.5, 0.5, 0.5]", "'\\u0000'",
        ]  # fmt: skip
        for _ in range(rng.randrange(1, 4)):
            n = rng.randrange(len(lines))
            if "=" in lines[n]:
                lines[n] = lines[n].split("=")[0] + "= " + rng.choice(values)
    return "\n".join(lines).encode()


def refusal(reader, path: Path) -> BadInput | None:
    """The complaint about a file, if there is one; anything but `BadInput` fails the test."""
    try:
        reader(path)
    except BadInput as error:
        return error
    return None


@pytest.mark.parametrize(
    ("reader", "text"),
    [(read_state, GOOD), (read_state, STATE_TOML), (read_liquid, LIQUID_TOML), (read_study, STUDY_TOML)],
    ids=["state", "state template", "liquid", "study"],
)
def test_fuzzed_files_are_read_or_refused(tmp_path: Path, reader, text: str) -> None:
    rng = random.Random(20240601)
    path = tmp_path / "file.toml"
    refused = 0
    for _ in range(1500):
        path.write_bytes(mutated(text, rng))
        complaint = refusal(reader, path)
        if complaint is not None:
            assert complaint.problems
            assert all(problem.file and problem.allowed for problem in complaint.problems)
            refused += 1
    assert 200 < refused < 1500  # some still pass, most do not: the mutations bite


def test_real_units(tmp_path: Path) -> None:
    """Molar volume and packing fraction; R and N_A are exact in the SI (CODATA 2018)."""
    text = changed("packing_fraction = 0.40", "molar_volume = 33.8").replace("[1.0, 1.5]\nwell_d", "[3.3, 3.5]\nwell_d")
    request = read_state(written(tmp_path, text + '[units]\nlength = "angstrom"\nenergy = "kelvin"\n'))
    density = float(request.mixture.densities(request.state).sum())
    assert density == pytest.approx(0.602214076 / 33.8)
    assert molar_volume_from_density(density_from_molar_volume(33.8)) == pytest.approx(33.8)
    assert request.mixture.packing_fraction(request.state) == pytest.approx(
        math.pi / 6 * density * 0.5 * (3.3**3 + 3.5**3)
    )
    assert Units("angstrom", "kelvin").energy_out(100.0) == pytest.approx(831.446261815324)
    assert Units().energy_out(100.0) == 100.0
