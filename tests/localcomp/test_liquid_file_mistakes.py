"""Every mistake in a pure-liquid file is named."""

from __future__ import annotations

import pytest

from localcomp.calibrate import read_liquid
from localcomp.errors import BadInput
from localcomp.units import GAS_CONSTANT
from tests.localcomp.state_files import LIQUID, STATE, with_line, without


def edit(key: str, line: str) -> str:
    return with_line(LIQUID, key, line)


BOTH = "residual_energy = -5786.0\nheat_of_vaporization = 6437.0"

CASES = {
    "a state file": (STATE, "[state]", ["localcomp state"]),
    "fluid a list": (LIQUID.replace("[fluid]", "[[fluid]]"), "[fluid]", ["must be a table"]),
    "no temperature": (without(LIQUID, "temperature"), "[fluid] temperature", ["is missing", "kelvin"]),
    "no volume": (without(LIQUID, "molar_volume"), "[fluid] molar_volume", ["is missing", "cm3/mol"]),
    "no pressure": (without(LIQUID, "pressure"), "[fluid] pressure", ["is missing", "kPa"]),
    "no energy": (without(LIQUID, "residual_energy"), "residual_energy", ["exactly one of"]),
    "two energies": (edit("residual_energy", BOTH), "and heat_of_vaporization", ["exactly one of"]),
    "misspelt": (edit("molar_volume", "molar_volum = 28.6"), "molar_volum", ['did you mean "molar_volume"?']),
    "extra": (LIQUID + "viscosity = 1\n", "viscosity = 1", ["unknown key"]),
    "positive energy": (edit("residual_energy", "residual_energy = 5786.0"), "residual_energy", ["negative"]),
    "zero energy": (edit("residual_energy", "residual_energy = 0"), "residual_energy = 0", ["negative"]),
    "negative heat": (edit("residual_energy", "heat_of_vaporization = -6437"), "heat_of_vaporization", ["positive"]),
    "heat below RT": (edit("residual_energy", "heat_of_vaporization = 500"), "heat_of_vaporization = 500", ["RT"]),
    "negative temperature": (edit("temperature", "temperature = -87.3"), "temperature = -87.3", ["positive"]),
    "zero volume": (edit("molar_volume", "molar_volume = 0.0"), "molar_volume = 0.0", ["positive"]),
    "nan pressure": (edit("pressure", "pressure = nan"), "pressure = nan", ["kPa"]),
    "boolean pressure": (edit("pressure", "pressure = true"), "pressure = True", ["kPa"]),
    "text energy": (edit("residual_energy", 'residual_energy = "-5786"'), "residual_energy", ["negative"]),
    "huge volume": (edit("molar_volume", "molar_volume = 1e200"), "molar_volume", ["1e-30 and 1e+30"]),
    "range one": (edit("well_range", "well_range = 1.0"), "well_range = 1.0", ["(1, 2.5]"]),
    "range too long": (edit("well_range", "well_range = 3"), "well_range = 3", ["(1, 2.5]"]),
    "closure": (edit("closure", 'closure = "hmc"'), "closure = 'hmc'", ['did you mean "hnc"?']),
    "name a number": (edit("name", "name = 3"), "name = 3", ["short line of text"]),
    "name of two lines": (edit("name", 'name = "a\\nb"'), "name", ["short line of text"]),
    "long source": (edit("source", f'source = "{300 * "s"}"'), "source", ["short line of text"]),
}


@pytest.mark.parametrize("case", CASES)
def test_a_mistake_is_named(case, write, run):
    text, key, words = CASES[case]
    path = write(text, "liquid.toml")
    with pytest.raises(BadInput) as caught:
        read_liquid(path)
    ran = run("calibrate", path)
    assert (ran.status, ran.out) == (2, "")
    for message in (str(caught.value), ran.err):
        assert str(path) in message
        assert key in message
        assert all(word in message for word in words)
        assert "Traceback" not in message


def test_a_good_file_and_its_defaults(write):
    text = LIQUID
    for key in ("name", "well_range", "closure", "source"):
        text = without(text, key)
    liquid = read_liquid(write(text))
    assert (liquid.name, liquid.well_range, liquid.closure, liquid.source) == ("liquid", 1.5, "rhnc", "not given")


def test_heat_of_vaporization_gives_the_residual_energy(write):
    # Definition: dH_vap = (U_gas + RT) - (U_liquid + P V_liquid), the vapour an ideal gas.
    text = edit("residual_energy", "heat_of_vaporization = 6437.0")
    liquid = read_liquid(write(text))
    expected = -6437.0 + GAS_CONSTANT * 87.3 - 101.302e3 * 28.628e-6
    assert liquid.residual_energy == pytest.approx(expected, rel=1e-12)
    assert liquid.residual_energy == pytest.approx(-5786.0, rel=0.02), "near the measured one: the vapour is dilute"
