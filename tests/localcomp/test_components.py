"""The component table: sources, virial square wells against published numbers, files of one's own, the command."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from localcomp.components import component_named, load_components
from localcomp.errors import BadInput
from ozsolve import Mixture, State, reference, solve
from tests.readers import numbers, read

ALL = load_components()
HANDBOOK_NAMES = {"CarbonDioxide": "carbon dioxide"}
WITHIN = {"argon": 5.0, "krypton": 6.0, "neon": 2.0, "nitrogen": 3.0, "oxygen": 14.0, "carbon dioxide": 4.0}
"""cm3/mol: largest distance of the fits from their own reference (tests/data/b2_handbook.csv; the fits' table gives
maxima of 10, 3.5, 1.4, 1.4, 13.4 and 1.1 over their whole ranges)."""


def test_every_number_has_a_source() -> None:
    assert len(ALL) >= 14
    for component in ALL.values():
        assert component.liquids or component.virial
        assert all(point.source for point in component.liquids)
        if component.virial is not None:
            assert "Kaye and Laby" in component.virial.source


def test_a_virial_fit_is_a_square_well_exactly() -> None:
    """B2/b0 = 1 - (lam^3 - 1)(exp(eps/kT) - 1) (Hirschfelder, Curtiss and Bird 1954, section 3.5)."""
    for component in ALL.values():
        if component.virial is None:
            continue
        v = component.virial
        for t in (150.0, 300.0, 600.0):
            exact = (v.a - v.b) * reference.square_well_b2(v.well_range, v.well_depth / t)
            assert v.second_virial(t) == pytest.approx(exact, rel=1e-12)
            assert v.second_virial(t) != pytest.approx(exact * 1.001, rel=1e-4)


HANDBOOK = [row for row in read("b2_handbook") if numbers(row)]


@pytest.mark.parametrize("row", HANDBOOK, ids=lambda r: f"{r['fluid']} {r['T_K']}")
def test_virial_wells_against_the_handbook(row: dict[str, str]) -> None:
    """Published second virial coefficients (sources in tests/data/b2_handbook.csv) inside the fits' ranges."""
    name = HANDBOOK_NAMES.get(row["fluid"], row["fluid"].lower())
    virial = ALL[name].virial if name in ALL else None
    t, published, exact = (float(row[key]) for key in ("T_K", "B_published", "B_reference"))
    if virial is None or not virial.temperatures[0] <= t <= virial.temperatures[1]:
        return
    assert virial.second_virial(t) == pytest.approx(exact, abs=WITHIN[name])
    assert virial.second_virial(t) == pytest.approx(published, abs=WITHIN[name] + abs(published - exact))
    assert virial.second_virial(1.2 * t) != pytest.approx(exact, abs=0.1)


def test_virial_parameters_put_liquid_argon_inside_the_two_phase_region() -> None:
    """What the list says of them: no solution of the closure, or a fluid unstable at constant pressure."""
    argon = ALL["argon"]
    assert argon.virial is not None
    v = argon.virial
    point = next(p for p in argon.liquids if p.temperature == 87.3)
    rho = 0.602214076 / point.molar_volume
    mixture = Mixture([v.diameter], [v.well_depth], v.well_range)
    found = solve(mixture, State(point.temperature, (1.0,), density=rho), on_failure="return")
    energy = found.internal_energy * 8.31446261815324
    assert not found.status.usable or abs(energy / point.residual_energy - 1.0) > 0.05


def test_files_of_ones_own_extend_and_replace(write: Callable[..., Path]) -> None:
    text = (
        '[[component]]\nname = "mine"\n[[component.liquid]]\ntemperature = 300\nmolar_volume = 90\n'
        'residual_energy = -30000\npressure = 10\nsource = "own measurement"\n'
        '[[component]]\nname = "argon"\n[component.virial]\na = 150\nb = 110\nc = 100\ntemperatures = [80, 900]\n'
        'source = "own fit"\n'
    )
    found = load_components(write(text, "own.toml"))
    assert found["mine"].liquids[0].molar_volume == 90.0
    assert found["argon"].virial is not None
    assert found["argon"].virial.source == "own fit"
    assert found["argon"].liquids == ()
    assert component_named("KRYPTON", found).name == "krypton"


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        ("molar_volume = 90", "molar_volume = -90", ["molar_volume", "-90", "positive"]),
        ("residual_energy = -30000", "residual_energy = 30000", ["residual_energy", "negative"]),
        ('source = "own"', "", ["source", "where the numbers come from"]),
        ("pressure = 10", "presure = 10", ["presure", "pressure"]),
        ('name = "mine"', "", ["name"]),
        ("[[component]]", "[[compound]]", ["component"]),
    ],
)
def test_mistakes_are_named(old: str, new: str, words: list[str], write: Callable[..., Path]) -> None:
    text = (
        '[[component]]\nname = "mine"\n[[component.liquid]]\ntemperature = 300\nmolar_volume = 90\n'
        'residual_energy = -30000\npressure = 10\nsource = "own"\n'
    )
    wrong = text.replace(old, new).replace("[[component.liquid]]", "[[compound.liquid]]" if "compound" in new else
                                           "[[component.liquid]]")  # fmt: skip
    with pytest.raises(BadInput) as error:
        load_components(write(wrong, "own.toml"))
    assert all(word in str(error.value) for word in words)


def test_the_command(run: Callable[..., object]) -> None:
    listed = run("components")
    assert listed.status == 0  # type: ignore[attr-defined]
    assert all(name in listed.out for name in ALL)  # type: ignore[attr-defined]
    one = run("components", "argon")
    assert "Kaye and Laby" in one.out  # type: ignore[attr-defined]
    assert "Tegeler" in one.out  # type: ignore[attr-defined]
    body = json.loads(run("components", "krypton", "--json").out)  # type: ignore[attr-defined]
    assert body["components"][0]["virial"]["well_depth_K"] == 145.3
    assert np.isclose(body["components"][0]["virial"]["diameter_angstrom"], 3.2070, atol=5e-5)
    wrong = run("components", "argn")
    assert wrong.status == 2  # type: ignore[attr-defined]
    assert "argon" in wrong.err  # type: ignore[attr-defined]
