"""Units: molar volume and packing fraction, kelvin and J/mol."""

from __future__ import annotations

import math

import pytest

from localcomp.inputs import read_state
from localcomp.report import as_json, pressure_mpa, report_state
from localcomp.units import GAS_CONSTANT, Units, density_from_molar_volume, molar_volume_from_density
from tests.localcomp.state_files import STATE, with_line

# 2019 SI (BIPM, The International System of Units, 9th edition, 2019): both constants are exact.
BOLTZMANN = 1.380649e-23
AVOGADRO = 6.02214076e23

REAL = STATE + '[units]\nlength = "angstrom"\nenergy = "kelvin"\n'
REAL = with_line(REAL, "diameter", "diameter = [3.3, 4.95]")
REAL = with_line(REAL, "well_depth", "well_depth = [120.0, 180.0]")
REAL = with_line(REAL, "temperature", "temperature = 240.0")


def test_the_gas_constant_is_the_product_of_the_two_exact_ones():
    assert pytest.approx(BOLTZMANN * AVOGADRO, rel=1e-15) == GAS_CONSTANT


def test_molar_volume_and_density_are_inverse():
    # One molecule per cubic angstrom is N_A molecules in 0.602... cm3.
    assert density_from_molar_volume(AVOGADRO * 1e-24) == pytest.approx(1.0, rel=1e-15)
    assert molar_volume_from_density(density_from_molar_volume(33.345)) == pytest.approx(33.345, rel=1e-15)


def test_molar_volume_is_a_packing_fraction(write):
    volume = 55.0
    request = read_state(write(with_line(REAL, "packing_fraction", f"molar_volume = {volume}")))
    spheres = 0.5 * (math.pi / 6.0) * (3.3e-10**3 + 4.95e-10**3)  # m3 per molecule
    assert request.mixture.packing_fraction(request.state) == pytest.approx(AVOGADRO * spheres / 55e-6, rel=1e-12)


def test_density_is_a_packing_fraction(write):
    request = read_state(write(with_line(STATE, "packing_fraction", "density = 0.3")))
    expected = 0.3 * math.pi / 6.0 * 0.5 * (1.0 + 1.5**3)
    assert request.mixture.packing_fraction(request.state) == pytest.approx(expected, rel=1e-14)


def test_kelvin_and_angstrom_describe_the_same_fluid(write):
    reduced = as_json(report_state(read_state(write(STATE))))
    real = as_json(report_state(read_state(write(REAL, "real.toml"))))
    for key in ("coordination_numbers", "neighbor_ratios", "contact_values"):
        for row, other in zip(reduced[key], real[key], strict=True):
            assert row == pytest.approx(other, rel=1e-9)
    assert (reduced["units"]["internal_energy"], real["units"]["internal_energy"]) == ("energy unit", "J/mol")
    # U/N = u eps, with eps/k = 120 K: u * 120 K * R per mole.
    for key in (real["internal_energy"], real["numerical_error"]["internal_energy"]):
        assert key != 0.0
    ratio = real["internal_energy"] / reduced["internal_energy"]
    assert ratio == pytest.approx(120.0 * BOLTZMANN * AVOGADRO, rel=1e-9)
    bars = real["numerical_error"]["internal_energy"] / reduced["numerical_error"]["internal_energy"]
    assert bars == pytest.approx(120.0 * BOLTZMANN * AVOGADRO, rel=1e-3)


def test_pressure_in_megapascal(write):
    report = report_state(read_state(write(REAL)))
    density = float(report.solution.densities.sum()) * 1e30
    expected = report.solution.virial_z * density * BOLTZMANN * 240.0 * 1e-6
    assert pressure_mpa(report, report.solution.virial_z) == pytest.approx(expected, rel=1e-12)
    assert as_json(report)["pressure_mpa"]["virial"] == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize("lines", ['length = "angstrom"', 'energy = "kelvin"', ""])
def test_no_pressure_without_both_units(lines, write):
    report = report_state(read_state(write(STATE + f"[units]\n{lines}\n")))
    assert pressure_mpa(report, 1.0) is None
    assert "pressure_mpa" not in as_json(report)


def test_labels():
    assert (Units().energy_label, Units().length_label, Units().temperature_label) == (
        "energy unit",
        "length unit",
        "kT/energy unit",
    )
    real = Units("angstrom", "kelvin")
    assert (real.energy_label, real.length_label, real.temperature_label) == ("J/mol", "angstrom", "K")
