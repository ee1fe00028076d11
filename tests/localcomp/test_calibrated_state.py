"""From a measured liquid to a state file and back: the numbers a user would type agree with the measured ones."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

from localcomp.calibrate import calibrate, calibration_json, read_liquid
from localcomp.inputs import read_state
from localcomp.report import as_json, report_state
from tests.localcomp.state_files import LIQUID, with_line

STUDIES = Path(__file__).resolve().parents[2] / "studies" / "argon_krypton"

STATE = """\
[units]
length = "angstrom"
energy = "kelvin"
[mixture]
diameter = [{sigma!r}]
well_depth = [{depth!r}]
well_range = {reach}
[state]
temperature = {temperature}
molar_volume = {volume}
closure = "{closure}"
"""


@pytest.mark.parametrize("closure", ["rhnc", "msa"])
def test_a_calibrated_sphere_has_the_measured_energy_and_pressure(closure, write):
    liquid = read_liquid(write(with_line(LIQUID, "closure", f'closure = "{closure}"'), "liquid.toml"))
    found = calibrate(liquid)
    text = STATE.format(
        sigma=found.diameter, depth=found.well_depth, reach=liquid.well_range, temperature=liquid.temperature,
        volume=liquid.molar_volume, closure=closure,
    )  # fmt: skip
    body = as_json(report_state(read_state(write(text))))
    assert body["units"]["internal_energy"] == "J/mol"
    assert body["internal_energy"] == pytest.approx(liquid.residual_energy, rel=1e-6)
    assert body["packing_fraction"] == pytest.approx(found.packing_fraction, rel=1e-9)
    # 0.101302 MPa against a scale of rho RT = 25 MPa
    assert body["pressure_mpa"]["energy"] == pytest.approx(liquid.pressure * 1e-3, abs=1e-4)
    assert body["pressure_mpa"]["virial"] == pytest.approx(found.virial_pressure * 1e-3, rel=1e-5)
    wrong = text.replace(repr(found.diameter), repr(1.001 * found.diameter))
    off = as_json(report_state(read_state(write(wrong))))
    assert abs(off["pressure_mpa"]["energy"] - liquid.pressure * 1e-3) > 0.1, "0.1 % in sigma must show"


def test_the_json_says_what_was_reached_and_in_which_unit():
    liquid = read_liquid(STUDIES / "krypton.toml")
    body: dict[str, Any] = calibration_json(calibrate(liquid))
    conditions = body["conditions"]
    assert isinstance(conditions, dict)
    for name, measured in (("residual_energy", -8202.0), ("pressure", 73.565)):
        assert conditions[name]["measured"] == measured
        assert conditions[name]["reached"] == pytest.approx(measured, rel=1e-3)
    assert body["units"]["diameter"] == "angstrom"
    assert body["units"]["well_depth"] == "kelvin (eps/k)"
    assert body["reduced_temperature"] == pytest.approx(115.78 / body["well_depth"])


def test_a_heavier_noble_gas_is_larger_and_stickier():
    """Common practice, no source: sigma of argon and krypton is near 3.40 and 3.65 angstrom in any fit of a simple
    pair potential, and eps/k rises with the boiling point (87 and 120 K)."""
    argon, krypton = (calibrate(read_liquid(STUDIES / f"{name}.toml")) for name in ("argon", "krypton"))
    assert argon.diameter < krypton.diameter
    assert argon.well_depth < krypton.well_depth
    assert argon.diameter == pytest.approx(3.40, rel=0.05)
    assert krypton.diameter == pytest.approx(3.65, rel=0.05)
