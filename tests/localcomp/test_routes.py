"""The energy route and the calibration of pure liquids."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from localcomp.calibrate import PureLiquid, calibrate, read_liquid
from localcomp.energyroute import energy_route
from localcomp.errors import BadInput, NoAnswer
from localcomp.hardspheres import bmcsl_compressibility_factor
from localcomp.units import AVOGADRO_A3_PER_CM3, GAS_CONSTANT
from ozsolve import Mixture, State, solve
from tests.problems import PROBLEMS
from tests.readers import numbers, read

STUDY = Path(__file__).resolve().parents[2] / "studies" / "argon_krypton"


def test_hard_sphere_mixture_pressure() -> None:
    """Boublik (1970), Mansoori, Carnahan, Starling and Leland (1971): column Z_BMCSL; one component:
    Carnahan and Starling, J. Chem. Phys. 51 (1969) 635."""
    for row in map(numbers, read("hs_mixture_py_bmcsl")):
        rho = np.array([row["x1"], 1 - row["x1"]]) * row["rho"]
        found = bmcsl_compressibility_factor(rho, np.array([1.0, row["ratio"]]))
        assert found == pytest.approx(row["Z_BMCSL"], rel=1e-6)
        other = bmcsl_compressibility_factor(1.001 * rho, np.array([1.0, row["ratio"]]))
        assert other != pytest.approx(row["Z_BMCSL"], rel=1e-6)
    eta = 0.4
    carnahan_starling = (1 + eta + eta**2 - eta**3) / (1 - eta) ** 3
    assert bmcsl_compressibility_factor(np.array([6 * eta / np.pi]), np.array([1.0])) == pytest.approx(
        carnahan_starling
    )


@pytest.mark.parametrize("name", ["one component", "unlike", "ternary"])
def test_pressure_is_the_density_derivative_of_the_helmholtz_energy(name: str) -> None:
    mixture, state = PROBLEMS[name]
    route = energy_route(mixture, state, "rhnc", 1e-7)
    step, ends = 1e-3, []
    assert state.packing_fraction is not None
    for sign in (1.0, -1.0):
        denser = replace(state, packing_fraction=state.packing_fraction * (1 + sign * step))
        ends.append(energy_route(mixture, denser, "rhnc", 1e-7).helmholtz_attraction)
    assert route.z_attraction == pytest.approx((ends[0] - ends[1]) / (2 * step), rel=1e-4)


def test_gauss_points_suffice() -> None:
    mixture, state = PROBLEMS["unlike"]
    six, ten = (energy_route(mixture, state, "rhnc", 1e-7, points) for points in (6, 10))
    assert six.z == pytest.approx(ten.z, abs=1e-5)
    assert energy_route(mixture, state, "rhnc", 1e-7, 1).z != pytest.approx(ten.z, abs=1e-5)


def test_hard_spheres_have_no_attraction_part() -> None:
    route = energy_route(*PROBLEMS["hard"], "rhnc")
    assert route.helmholtz_attraction == 0.0
    assert route.z == route.z_hard_sphere


def test_non_additive_spheres_are_refused() -> None:
    with pytest.raises(NoAnswer, match="additive"):
        energy_route(*PROBLEMS["non-additive"], "rhnc")


def made_up(sigma: float, depth: float, temperature: float, eta: float) -> PureLiquid:
    """A 'measured' liquid that is a square well in truth."""
    mixture, state = Mixture(1.0, 1.0), State(temperature / depth, packing_fraction=eta)
    solution = solve(mixture, state)
    rho = 6 * eta / np.pi / sigma**3
    volume = AVOGADRO_A3_PER_CM3 / rho
    rt = GAS_CONSTANT * temperature
    z = energy_route(mixture, state, "rhnc").z
    energy = solution.internal_energy * depth / temperature * rt
    return PureLiquid("made up", temperature, volume, energy, z * rt / (volume * 1e-3))


def check_recovered(liquid: PureLiquid, sigma: float, depth: float) -> None:
    found = calibrate(liquid)
    assert found.diameter == pytest.approx(sigma, rel=1e-5)
    assert found.well_depth == pytest.approx(depth, rel=1e-4)


def test_calibration_recovers_the_truth() -> None:
    liquid = made_up(3.4, 120.0, 110.0, 0.38)
    check_recovered(liquid, 3.4, 120.0)
    with pytest.raises(AssertionError):
        check_recovered(replace(liquid, residual_energy=1.01 * liquid.residual_energy), 3.4, 120.0)


@pytest.mark.parametrize("name", ["argon", "krypton"])
def test_the_study_liquids_meet_both_conditions(name: str) -> None:
    """Data: reference equations of state, as in the study's files."""
    liquid = read_liquid(STUDY / f"{name}.toml")
    found = calibrate(liquid)
    assert found.residual_energy == pytest.approx(liquid.residual_energy, rel=1e-6)
    assert found.pressure == pytest.approx(liquid.pressure, abs=1.0)
    assert 0.3 < found.packing_fraction < 0.42
    again = solve(Mixture(1.0, 1.0), State(found.reduced_temperature, packing_fraction=found.packing_fraction))
    per_mole = again.internal_energy / found.reduced_temperature * GAS_CONSTANT * liquid.temperature
    assert per_mole == pytest.approx(liquid.residual_energy, rel=1e-5)


@pytest.mark.parametrize(
    ("changes", "reason"),
    [
        ({"residual_energy": -50.0}, "too small"),
        ({"residual_energy": -60000.0}, "too strong"),
        ({"pressure": 5e6}, "pressure condition"),
    ],
)
def test_a_liquid_without_answer_gets_a_reason(changes, reason: str) -> None:
    liquid = replace(read_liquid(STUDY / "argon.toml"), **changes)
    with pytest.raises(NoAnswer, match=reason) as caught:
        calibrate(liquid)
    assert "argon" in str(caught.value)


def liquid_file(tmp_path: Path, **changes: str) -> Path:
    lines = dict(temperature="115.77", molar_volume="33.345", residual_energy="-4826.0", pressure="952.503", **{})
    lines.update(changes)
    path = tmp_path / "liquid.toml"
    path.write_text("[fluid]\n" + "".join(f"{k} = {v}\n" for k, v in lines.items() if v), encoding="utf-8")
    return path


def test_heat_of_vaporization_in_place_of_the_energy(tmp_path: Path) -> None:
    """U_res = -(dH - RT + P V) with an ideal vapour; for argon at its boiling point the vapour is ideal to a
    good per cent
    (5786 J/mol against 6437 - RT + PV, table of saturated liquids)."""
    path = liquid_file(
        tmp_path, temperature="87.3", molar_volume="28.628", residual_energy="", heat_of_vaporization="6437.0",
        pressure="101.302",
    )  # fmt: skip
    assert read_liquid(path).residual_energy == pytest.approx(-5786.0, rel=0.015)


@pytest.mark.parametrize(
    ("changes", "part"),
    [
        ({"residual_energy": "4826.0"}, "negative"),
        ({"residual_energy": ""}, "exactly one"),
        ({"heat_of_vaporization": "5303.0"}, "exactly one"),
        ({"temperature": "-1"}, "temperature"),
        ({"well_range": "0.9"}, "well_range"),
        ({"closure": '"xyz"'}, "closure"),
        ({"molar_volme": "3"}, 'did you mean "molar_volume"'),
        ({"residual_energy": "", "heat_of_vaporization": "10.0"}, "exceed RT"),
    ],
)
def test_bad_liquid_files(tmp_path: Path, changes, part: str) -> None:
    with pytest.raises(BadInput, match=part):
        read_liquid(liquid_file(tmp_path, **changes))
