"""Every mistake in a state file is named: file, key, value, what is allowed."""

from __future__ import annotations

import math

import pytest

from localcomp.errors import BadInput
from localcomp.inputs import read_state
from tests.localcomp.state_files import STATE, TERNARY, with_line, without


def edit(key: str, line: str) -> str:
    return with_line(STATE, key, line)


def ternary(key: str, line: str) -> str:
    return with_line(TERNARY, key, line)


# name: (text, key as the message shows it, words the message must have)
CASES = {
    # missing
    "no mixture": (STATE.replace("[mixture]", "[mixtures]"), "[mixture]", ["is missing", 'did you mean "mixture"?']),
    "no state": (STATE[: STATE.index("[state]")], "[state]", ["is missing"]),
    "no diameter": (without(STATE, "diameter"), "[mixture] diameter", ["is missing", "positive"]),
    "no depth": (without(STATE, "well_depth"), "[mixture] well_depth", ["is missing"]),
    "no temperature": (without(STATE, "temperature"), "[state] temperature", ["is missing", "positive"]),
    "no fractions": (without(STATE, "mole_fractions"), "[state] mole_fractions", ["is missing", "sum to 1"]),
    "no density": (without(STATE, "packing_fraction"), "packing_fraction", ["is missing", "exactly one of"]),
    # misspelt and extra
    "misspelt temperature": (edit("temperature", "temprature = 2.0"), "temprature", ['did you mean "temperature"?']),
    "misspelt diameter": (edit("diameter", "diamter = [1.0, 1.5]"), "diamter", ['did you mean "diameter"?']),
    "capital key": (edit("temperature", "Temperature = 2.0"), "Temperature", ['did you mean "temperature"?']),
    "extra key": (STATE.replace("k = 0.1", "k = 0.1\nzzz = 3"), "[mixture] zzz = 3", ["unknown key", "known: names"]),
    "extra table": (STATE + "[memo]\nx = 1\n", "memo", ["unknown key"]),
    "loose key": ("k = 1\n" + STATE, "k = 1", ["unknown key"]),
    "extra shell key": (STATE.replace("[shell]", "[shell]\nradius = 2"), "[shell] radius = 2", ["unknown key"]),
    "extra unit": (STATE + '[units]\nmass = "kg"\n', "[units] mass", ["unknown key"]),
    "extra accuracy key": (STATE + "grid = 512\n", "[numerics] grid = 512", ["unknown key", "accuracy"]),
    # wrong type
    "boolean temperature": (edit("temperature", "temperature = true"), "temperature = True", ["positive number"]),
    "text temperature": (edit("temperature", 'temperature = "2.0"'), "temperature = '2.0'", ["positive number"]),
    "list temperature": (edit("temperature", "temperature = [2.0]"), "temperature = [2.0]", ["positive number"]),
    "date temperature": (edit("temperature", "temperature = 1979-05-27"), "temperature", ["positive number"]),
    "table temperature": (edit("temperature", "temperature = {a = 1}"), "temperature", ["positive number"]),
    "scalar diameter": (edit("diameter", "diameter = 1.0"), "diameter = 1.0", ["list of positive numbers"]),
    "empty diameter": (edit("diameter", "diameter = []"), "diameter = []", ["list of positive numbers"]),
    "boolean diameter": (edit("diameter", "diameter = [1.0, true]"), "diameter", ["list of positive numbers"]),
    "nested diameter": (edit("diameter", "diameter = [[1.0], [1.5]]"), "diameter", ["list of positive numbers"]),
    "text in fractions": (edit("mole_fractions", 'mole_fractions = [0.5, "0.5"]'), "mole_fractions", ["sum to 1"]),
    "boolean fractions": (edit("mole_fractions", "mole_fractions = [true, false]"), "mole_fractions", ["sum to 1"]),
    "mixture a number": ("mixture = 3\n" + STATE[STATE.index("[state]") :], "mixture", ["must be a table"]),
    "mixture a list": (STATE.replace("[mixture]", "[[mixture]]"), "mixture", ["must be a table"]),
    "state a text": ('state = "liquid"\n' + STATE[: STATE.index("[state]")], "state", ["must be a table"]),
    "shell a number": ("shell = 3\n" + STATE[: STATE.index("[shell]")], "shell", ["must be a table"]),
    "number as closure": (edit("closure", "closure = 3"), "closure = 3", ["one of: msa, py, hnc, rhnc"]),
    "list as names": (edit("names", 'names = "small, large"'), "names", ["list of short names"]),
    "numbers as names": (edit("names", "names = [1, 2]"), "names = [1, 2]", ["list of short names"]),
    # not finite, too large for a number
    "nan temperature": (edit("temperature", "temperature = nan"), "temperature = nan", ["positive number"]),
    "inf temperature": (edit("temperature", "temperature = inf"), "temperature = inf", ["positive number"]),
    "nan depth": (edit("well_depth", "well_depth = [1.0, nan]"), "well_depth", ["finite"]),
    "inf depth": (edit("well_depth", "well_depth = [1.0, -inf]"), "well_depth", ["finite"]),
    "nan fraction": (edit("mole_fractions", "mole_fractions = [nan, 0.5]"), "mole_fractions", ["[0, 1]"]),
    "nan packing": (edit("packing_fraction", "packing_fraction = nan"), "packing_fraction = nan", ["(0, 0.55)"]),
    "nan range": (edit("well_range", "well_range = nan"), "well_range = nan", ["larger than 1"]),
    "nan k": (edit("k", "k = nan"), "[mixture] k = nan", ["below 1"]),
    "nan accuracy": (edit("accuracy", "accuracy = nan"), "[numerics] accuracy = nan", ["1e-10 and 1e-2"]),
    "huge integer": (edit("temperature", "temperature = 1" + 400 * "0"), "temperature = 1000", ["positive number"]),
    "longest integer": (edit("temperature", "temperature = 0x" + 5000 * "f"), "temperature", ["positive number"]),
    "huge number": (edit("diameter", "diameter = [1e200, 1e200]"), "diameter", ["1e-30 and 1e+30"]),
    "tiny number": (edit("temperature", "temperature = 1e-300"), "temperature = 1e-300", ["1e-30 and 1e+30"]),
    # out of range
    "zero size": (edit("diameter", "diameter = [0.0, 1.5]"), "diameter = [0.0, 1.5]", ["positive"]),
    "negative size": (edit("diameter", "diameter = [1.0, -1.5]"), "diameter = [1.0, -1.5]", ["positive"]),
    "size ratio": (edit("diameter", "diameter = [1.0, 50.0]"), "diameter = [1.0, 50.0]", ["size ratios up to 20"]),
    "zero temperature": (edit("temperature", "temperature = 0"), "temperature = 0", ["positive"]),
    "negative temperature": (edit("temperature", "temperature = -1.5"), "temperature = -1.5", ["positive"]),
    "sum below one": (edit("mole_fractions", "mole_fractions = [0.5, 0.4]"), "mole_fractions", ["1, not 0.9"]),
    "sum above one": (edit("mole_fractions", "mole_fractions = [0.5, 0.51]"), "mole_fractions", ["1, not 1.01"]),
    "negative fraction": (edit("mole_fractions", "mole_fractions = [-0.5, 1.5]"), "mole_fractions", ["[0, 1]"]),
    "zero packing": (edit("packing_fraction", "packing_fraction = 0.0"), "packing_fraction = 0.0", ["(0, 0.55)"]),
    "negative packing": (edit("packing_fraction", "packing_fraction = -0.4"), "packing_fraction", ["(0, 0.55)"]),
    "packing at its limit": (edit("packing_fraction", "packing_fraction = 0.55"), "packing_fraction", ["(0, 0.55)"]),
    "packing above one": (edit("packing_fraction", "packing_fraction = 1.2"), "packing_fraction = 1.2", ["(0, 0.55)"]),
    "density too high": (edit("packing_fraction", "density = 5.0"), "[state] density = 5.0", ["fraction 5.727"]),
    "negative density": (edit("packing_fraction", "density = -0.3"), "density = -0.3", ["positive"]),
    "range one": (edit("well_range", "well_range = 1.0"), "well_range = 1.0", ["larger than 1"]),
    "range below one": (edit("well_range", "well_range = [1.5, 0.9]"), "well_range", ["larger than 1"]),
    "range too long": (edit("well_range", "well_range = 9.0"), "well_range = 9.0", ["at most 4"]),
    "k of one": (edit("k", "k = 1.0"), "k = 1.0", ["below 1"]),
    "l of one": (edit("l", "l = 1.0"), "l = 1.0", ["below 1"]),
    "coarse accuracy": (edit("accuracy", "accuracy = 0.5"), "accuracy = 0.5", ["1e-10 and 1e-2"]),
    "unknown closure": (edit("closure", 'closure = "rhncc"'), "closure = 'rhncc'", ['did you mean "rhnc"?']),
    "foreign closure": (edit("closure", 'closure = "SAFT"'), "closure = 'SAFT'", ["msa, py, hnc, rhnc"]),
    "unknown rule": (edit("rule", 'rule = "well_edges"'), "rule = 'well_edges'", ['did you mean "well_edge"?']),
    "idle multiple": (edit("rule", "multiple = 1.4"), "[shell] multiple = 1.4", ["only used with"]),
    "multiple of one": (edit("rule", 'rule = "multiple"\nmultiple = 1.0'), "multiple = 1.0", ["between 1 and 4"]),
    "unknown unit": (STATE + '[units]\nlength = "nanometre"\n', "length = 'nanometre'", ["reduced, angstrom"]),
    # sizes that do not match
    "too few depths": (edit("well_depth", "well_depth = [1.0]"), "well_depth", ["2 of them", "not 1"]),
    "too many depths": (edit("well_depth", "well_depth = [1, 1, 1]"), "well_depth", ["2 of them", "not 3"]),
    "too many ranges": (edit("well_range", "well_range = [2, 2, 2]"), "well_range", ["2 of them"]),
    "too many fractions": (edit("mole_fractions", "mole_fractions = [0.2, 0.3, 0.5]"), "mole_fractions", ["not 3"]),
    "too few names": (edit("names", 'names = ["small"]'), "names", ["2 different names"]),
    "same name twice": (edit("names", 'names = ["x", "x"]'), "names", ["2 different names"]),
    "blank name": (edit("names", 'names = ["x", " "]'), "names", ["short names"]),
    "control character": (edit("names", 'names = ["x", "y\\u001b[31m"]'), "names", ["short names"]),
    "too many species": (edit("diameter", f"diameter = {[1.0] * 9}"), "diameter", ["up to 8 species"]),
    # matrices
    "asymmetric k": (edit("k", "k = [[0.0, 0.1], [0.2, 0.0]]"), "[mixture] k", ["symmetric 2 x 2"]),
    "asymmetric l": (edit("l", "l = [[0.0, 0.1], [0.2, 0.0]]"), "[mixture] l", ["symmetric 2 x 2"]),
    "k with a diagonal": (edit("k", "k = [[0.1, 0.1], [0.1, 0.0]]"), "[mixture] k", ["zero diagonal"]),
    "k too small": (ternary("k", "k = [[0.0, 0.1], [0.1, 0.0]]"), "[mixture] k", ["3 x 3"]),
    "ragged k": (edit("k", "k = [[0.0, 0.1], [0.1]]"), "[mixture] k", ["2 x 2"]),
    "k a list": (edit("k", "k = [0.1, 0.1]"), "[mixture] k", ["2 x 2"]),
    "k a text": (edit("k", 'k = "0.1"'), "[mixture] k", ["2 x 2"]),
    "k a boolean": (edit("k", "k = false"), "[mixture] k = False", ["2 x 2"]),
    "k with text inside": (edit("k", 'k = [[0, "a"], ["a", 0]]'), "[mixture] k", ["2 x 2"]),
    # pairs
    "pair unknown": (ternary("between", 'between = ["a", "zz"]'), "[mixture.pairs] between", ["out of names", "'c'"]),
    "pair of one": (ternary("between", 'between = ["a", "a"]'), "[mixture.pairs] between", ["two different"]),
    "pair of three": (ternary("between", 'between = ["a", "b", "c"]'), "[mixture.pairs] between", ["two different"]),
    "pair of tables": (ternary("between", "between = [{}, {a = 1}]"), "[mixture.pairs] between", ["two different"]),
    "pair unnamed": (without(TERNARY, "between"), "[mixture.pairs] between", ["two different"]),
    "pair twice": (TERNARY + '[[mixture.pairs]]\nbetween = ["c", "a"]\n', "between = ['c', 'a']", ["given twice"]),
    "pair key misspelt": (TERNARY.replace("diameter = 3.6", "diametre = 3.6"), "diametre", ['mean "diameter"?']),
    "pair size": (TERNARY.replace("diameter = 3.6", "diameter = -3.6"), "pairs] diameter = -3.6", ["positive"]),
    "pair depth": (TERNARY.replace("= 150.0", "= nan"), "[mixture.pairs] well_depth = nan", ["finite"]),
    "pair range": (TERNARY.replace("= 1.4\n\n", "= 1.0\n\n"), "[mixture.pairs] well_range = 1.0", ["larger than 1"]),
    "pairs a table": (STATE.replace("l = 0.0", "[mixture.pairs]"), "[mixture] pairs", ["[[mixture.pairs]]"]),
    "pairs of numbers": (edit("l", "pairs = [1, 2]"), "[mixture.pairs]", ["must be a table"]),
    "well meets shoulder": (edit("well_depth", "well_depth = [1.0, -0.3]"), "well_depth of pair", ["outright"]),
    # densities
    "volume in reduced units": (edit("packing_fraction", "molar_volume = 40.0"), "molar_volume", ['"angstrom"']),
    "two densities": (edit("packing_fraction", "packing_fraction = 0.4\ndensity = 0.3"), "and density", ["one of"]),
    "three densities": (ternary("molar_volume", "molar_volume = 4\ndensity = 1\npacking_fraction = 0.4"), "and", []),
    "volume too small": (ternary("molar_volume", "molar_volume = 9.0"), "molar_volume = 9.0", ["0.55"]),
    "zero volume": (ternary("molar_volume", "molar_volume = 0"), "molar_volume = 0", ["positive"]),
}  # fmt: skip


@pytest.mark.parametrize("text", [STATE, TERNARY])
def test_the_files_the_mistakes_are_made_in_are_good(text, write):
    request = read_state(write(text))
    assert math.isclose(sum(request.state.mole_fractions), 1.0)


@pytest.mark.parametrize("case", CASES)
def test_a_mistake_is_named(case, write):
    text, key, words = CASES[case]
    path = write(text)
    with pytest.raises(BadInput) as caught:
        read_state(path)
    message = str(caught.value)
    naming = [line for line in message.splitlines() if key in line]
    assert naming, message
    for word in words:
        assert word in message
    for line in message.splitlines():
        assert line.startswith(str(path)), "every line names the file"
        assert len(line) < 400, "values are shown, not dumped"


@pytest.mark.parametrize("case", CASES)
def test_the_command_ends_with_status_2(case, write, run):
    text, key, words = CASES[case]
    path = write(text)
    ran = run("state", path)
    assert ran.status == 2
    assert ran.out == ""
    assert str(path) in ran.err
    assert key in ran.err
    assert all(word in ran.err for word in words)
    assert "Traceback" not in ran.err


def test_all_mistakes_are_told_at_once(write):
    text = with_line(with_line(STATE, "temperature", "temperature = -1"), "k", "k = 2")
    text = with_line(text, "closure", 'closure = "pyy"')
    with pytest.raises(BadInput) as caught:
        read_state(write(text))
    assert len(caught.value.problems) == 3


def test_a_deep_table_is_shown_short(write):
    with pytest.raises(BadInput, match="unknown key"):
        read_state(write(STATE + "[extra" + 2000 * ".a" + "]\n"))


def test_a_strange_key_cannot_write_to_the_terminal(write):
    with pytest.raises(BadInput) as caught:
        read_state(write(STATE + '"\\u001b[31m\\n" = 1\n'))
    assert str(caught.value).isprintable()


def test_pairs_can_go_by_number_when_there_are_no_names(write):
    text = without(TERNARY, "names").replace('["a", "c"]', '["1", "3"]')
    assert read_state(write(text)).mixture.pairs.well_depth[0, 2] == 150.0
