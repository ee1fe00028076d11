"""Study files: expansion, keys, and every mistake at once."""

from __future__ import annotations

from pathlib import Path

import pytest

from localcomp.errors import BadInput
from localcomp.study import read_study, temperature_unit
from localcomp.sweep import units
from localcomp.templates import STUDY_TOML
from ozsolve import Mixture
from tests.localcomp.sweeping import write_study

PAIR = """\
[units]
length = "angstrom"
energy = "kelvin"
[pair]
names = ["argon", "krypton"]
diameter = [3.29, 3.51]
well_depth = [114.9, 162.9]
k = [0.0, 0.02]
[conditions]
temperature = [110.0, 115.0]
packing_fraction = 0.37
composition = {{ from = 0.0, to = 1.0, steps = 3 }}
{more}
"""


def study(tmp_path: Path, text: str):
    path = tmp_path / "study.toml"
    path.write_text(text, encoding="utf-8")
    return read_study(path)


def test_the_template_expands(tmp_path: Path) -> None:
    found = study(tmp_path, STUDY_TOML)
    assert len(found.cases) == 3 * 3 * 2 * 2 * 4 * 7
    assert found.cases[0].labels["size_ratio"] == 1.0


def test_class_temperatures_are_reduced_by_the_mean_depth(tmp_path: Path) -> None:
    found = read_study(write_study(tmp_path / "s.toml"))
    case = next(c for c in found.cases if c.labels["energy_ratio"] == 2.0 and c.labels["reduced_temperature"] == 2.0)
    assert case.state.temperature == pytest.approx(2.0 * 1.5)


def test_a_pair_in_kelvin(tmp_path: Path) -> None:
    found = study(tmp_path, PAIR.format(more=""))
    assert len(found.cases) == 2 * 2 * 3
    assert {case.state.temperature for case in found.cases} == {110.0, 115.0}
    assert [c.state.mole_fractions for c in found.cases[:3:2]] == [(0.0, 1.0), (0.5, 0.5)]


def test_explicit_ternaries(tmp_path: Path) -> None:
    found = study(
        tmp_path,
        """
[[mixtures]]
diameter = [1.0, 1.2, 1.5]
well_depth = [1.0, 1.0, 1.5]
[[mixtures]]
diameter = [1.0, 1.0, 1.5]
well_depth = [1.0, 2.0, 1.5]
[conditions]
temperature = 2.0
packing_fraction = [0.35, 0.4]
mole_fractions = [[0.2, 0.3, 0.5], [0.0, 0.5, 0.5]]
closures = ["py", "rhnc"]
""",
    )
    assert len(found.cases) == 2 * 2 * 2 * 2


def test_keys_tell_physics_closure_and_accuracy_apart(tmp_path: Path) -> None:
    one = read_study(write_study(tmp_path / "a.toml"))
    keys = one.keys()
    assert len(set(keys)) == len(keys)
    text = (tmp_path / "a.toml").read_text() + "[numerics]\naccuracy = 1e-6\n"
    assert not set(keys) & set(study(tmp_path, text).keys())
    shell = (tmp_path / "a.toml").read_text() + '[shell]\nrule = "multiple"\nmultiple = 1.4\n'
    assert not set(keys) & set(study(tmp_path, shell).keys())


def test_units_of_work_hold_every_state_once_and_do_not_depend_on_what_is_known(tmp_path: Path) -> None:
    found = read_study(write_study(tmp_path / "s.toml"))
    work = units(found)
    assert sorted(key for keys, _ in work for key in keys) == sorted(found.keys())
    assert [keys for keys, _ in units(found)] == [keys for keys, _ in work]


BAD = {
    "[class]\nsize_ratio = 1.0\nenergy_ratio = 1.0\n": ["[conditions]"],
    "[conditions]\ntemperature = 1\npacking_fraction = 0.4\ncomposition = 0.5\n": ["[class], [pair] or [[mixtures]]"],
    "[class]\nsize_ratio = [1.0, -2.0]\nenergy_ratoi = 1.0\n[conditions]\ntemperature = 0\npacking_fraction = 0.7\n"
    'composition = [0.5, 1.5]\nclosures = ["pyy"]\n': [
        "size_ratio", "energy_ratoi", 'did you mean "energy_ratio"', "energy_ratio: is missing", "temperature",
        "packing_fraction", "composition", "closures",
    ],
    "[class]\nsize_ratio = { from = 1, to = 2 }\nenergy_ratio = 1\n[conditions]\ntemperature = 1\n"
    "packing_fraction = 0.4\ncomposition = 0.5\n": ["{ from = 1, to = 2, steps = 5 }"],
    "[[mixtures]]\ndiameter = [1, 1, 1]\nwell_depth = [1, 1, 1]\n[conditions]\ntemperature = 1\n"
    "packing_fraction = 0.4\ncomposition = 0.5\n": ["mole_fractions"],
    "[pair]\ndiameter = [1, 1, 1]\nwell_depth = [1, 1, 1]\n[conditions]\ntemperature = 1\n"
    "packing_fraction = 0.4\nmole_fractions = [[0.2, 0.2, 0.6]]\n": ["a pair has two species"],
}  # fmt: skip


@pytest.mark.parametrize("text", list(BAD))
def test_every_mistake_is_named_at_once(tmp_path: Path, text: str) -> None:
    with pytest.raises(BadInput) as caught:
        study(tmp_path, text)
    for part in BAD[text]:
        assert part in str(caught.value)
    assert all(str(tmp_path / "study.toml") in str(problem) for problem in caught.value.problems)


def test_the_second_species_of_three_is_not_the_last() -> None:
    mixture = Mixture([1.0, 1.1, 1.2], [1.0, 1.5, 3.0])
    units = {name: temperature_unit(mixture, name) for name in ("first", "second", "mean", "absolute")}
    assert units == pytest.approx({"first": 1.0, "second": 1.5, "mean": 5.5 / 3.0, "absolute": 1.0})


def test_a_class_too_large_to_build_is_refused_before_it_is_built(tmp_path: Path) -> None:
    long = "{ from = 1.0, to = 2.0, steps = 1000 }"
    path = tmp_path / "study.toml"
    path.write_text(
        f"[class]\nsize_ratio = {long}\nenergy_ratio = {long}\nk = {{ from = 0, to = 0.2, steps = 1000 }}\n"
        "[conditions]\ntemperature = 2.0\npacking_fraction = 0.3\ncomposition = 0.5\n"
    )
    with pytest.raises(BadInput, match="1000000000 pairs; up to 1000000"):
        read_study(path)


MIXED = """\
[[mixtures]]
names = ["a", "b"]
diameter = [1.0, 1.2]
well_depth = [1.0, 1.5]
[[mixtures]]
names = ["a", "b", "c"]
diameter = [1.0, 1.2, 1.4]
well_depth = [1.0, 1.5, 1.2]
[[mixtures]]
names = ["a", "b"]
diameter = [1.0, 1.2]
well_depth = [1.0, 1.5]
k = 0.1
[conditions]
temperature = 2.0
packing_fraction = 0.4
mole_fractions = [[0.3, 0.7], [0.2, 0.3, 0.5]]
"""


def test_rows_of_mole_fractions_go_with_mixtures_of_their_length(tmp_path: Path) -> None:
    found = study(tmp_path, MIXED)
    assert [len(case.state.mole_fractions) for case in found.cases] == [2, 3, 2]
    assert [case.labels["mixture_number"] for case in found.cases] == [1, 2, 3]
    with pytest.raises(BadInput, match="no row has 3 numbers"):
        study(tmp_path, MIXED.replace(", [0.2, 0.3, 0.5]", ""))
    with pytest.raises(BadInput, match="rows of 2 or 3 numbers"):
        study(tmp_path, MIXED.replace("[0.2, 0.3, 0.5]", "[0.5, 0.2, 0.2, 0.1]"))


def test_a_mistake_in_a_mixture_is_not_blamed_on_its_mole_fractions(tmp_path: Path) -> None:
    with pytest.raises(BadInput) as error:
        study(tmp_path, MIXED.replace("[1.0, 1.2, 1.4]", "[1.0, 1.2, -1.4]"))
    assert len(error.value.problems) == 1
    assert "diameter" in error.value.problems[0].key


def test_a_pair_with_a_bad_k_tells_its_other_mistakes_too(tmp_path: Path) -> None:
    text = "[pair]\nk = 2\ndiameter = [1.0, -1.0]\nwell_depth = [1.0, 1.0]\n"
    with pytest.raises(BadInput) as error:
        study(tmp_path, text + "[conditions]\ntemperature = 2\npacking_fraction = 0.4\ncomposition = 0.5\n")
    assert {p.key.split()[-1] for p in error.value.problems} == {"k", "diameter"}


def test_a_reference_without_depth_is_named(tmp_path: Path) -> None:
    text = "[class]\nsize_ratio = 1.2\nenergy_ratio = 0.0\n[conditions]\ntemperature = 2\npacking_fraction = 0.4\n"
    with pytest.raises(BadInput) as error:
        study(tmp_path, text + 'composition = 0.5\ntemperature_reference = "second"\n')
    assert [p.key.split()[-1] for p in error.value.problems] == ["temperature_reference"]
