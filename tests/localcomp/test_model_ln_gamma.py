"""ln gamma of the activity models: published and tabulated values, closed forms, thermodynamic consistency."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from scipy.optimize import brentq

from localcomp.models import MODELS, ActivityModel, ModelInput, QuasiChemical, Reading, excess_energy, ln_gamma
from localcomp.models.combinatorial import flory_huggins, staverman_guggenheim
from localcomp.models.firstorder import FirstOrderQuasiChemical
from localcomp.models.lsg import LatticeSurface
from localcomp.models.nrtl import Nrtl, nrtl_ln_gamma
from localcomp.models.randommixing import RandomMixing
from localcomp.models.uniquac import Uniquac, uniquac_residual
from localcomp.models.wilson import Wilson, wilson_ln_gamma
from tests.readers import numbers, read

ONE, ALL = Reading.ONE_CONTACT, Reading.ALL_CONTACTS
CASES = [(model, reading) for model in MODELS for reading in Reading]
case = pytest.mark.parametrize(("model", "reading"), CASES, ids=lambda v: getattr(v, "name", v))


def pair(x1: float) -> np.ndarray:
    return np.array([x1, 1.0 - x1])


def off_diagonal(a12: float, a21: float, diagonal: float) -> np.ndarray:
    return np.array([[diagonal, a12], [a21, diagonal]])


# --- published and tabulated values -------------------------------------------------------------------------


def test_ternary_table() -> None:
    """Wilson 1964, Renon and Prausnitz 1968, Abrams and Prausnitz 1975 with arbitrary parameters, evaluated with 30
    digits and verified against mole-number derivatives of G_E (tests/data/ternary_models.csv, header)."""
    x = np.array([0.2, 0.3, 0.5])
    factors = np.array([[1, 0.6, 0.4], [1.2, 1, 0.8], [0.9, 0.5, 1]])
    tau = np.array([[0, 0.5, 1.1], [0.2, 0, -0.3], [0.8, 0.6, 0]])
    alpha = np.array([[0, 0.3, 0.2], [0.3, 0, 0.4], [0.2, 0.4, 0]])
    r, q = np.array([2, 3.5, 0.92]), np.array([1.8, 2.9, 1.4])
    tau_uniquac = np.array([[1, 0.7, 1.3], [1.1, 1, 0.5], [0.6, 0.9, 1]])
    found = {
        "Wilson": wilson_ln_gamma(x, factors),
        "NRTL": nrtl_ln_gamma(x, tau, alpha),
        "UNIQUAC_comb": staverman_guggenheim(x, r, q, 10.0),
        "UNIQUAC_res": uniquac_residual(x, q, tau_uniquac),
    }
    for row in read("ternary_models"):
        expected = [float(row[f"lng{i}"]) for i in (1, 2, 3)]
        assert found[row["model"]] == pytest.approx(expected, abs=2e-14)
    transposed = [wilson_ln_gamma(x, factors.T), nrtl_ln_gamma(x, tau.T, alpha), uniquac_residual(x, q, tau_uniquac.T)]
    for wrong, name in zip(transposed, ("Wilson", "NRTL", "UNIQUAC_res"), strict=True):
        assert np.max(np.abs(wrong - found[name])) > 1e-3, "the check must see a transposed parameter table"


PXY = [numbers(row) for row in read("wilson_published_pxy")]


def pressure_of_propanol_water(x1: float, gas_constant: float, swap: bool = False) -> tuple[float, float]:
    """P/kPa and y1 at 60 C, modified Raoult's law; parameters and Antoine constants of the data file's header."""
    a = np.array([[0.0, 775.48], [1351.90, 0.0]])
    volume = np.array([75.14, 18.07])
    factors = volume[None, :] / volume[:, None] * np.exp(-(a.T if swap else a) / (gas_constant * 333.15))
    saturation = np.exp(
        np.array([16.1154, 16.3872]) - np.array([3483.67, 3885.70]) / (60.0 + np.array([205.807, 230.170]))
    )
    x = pair(x1)
    partial = x * np.exp(wilson_ln_gamma(x, factors)) * saturation
    return float(partial.sum()), float(partial[0] / partial.sum())


@pytest.mark.parametrize("row", PXY, ids=lambda row: f"x{row['x1']:g}")
def test_published_vapour_liquid_equilibrium(row: dict[str, float]) -> None:
    """1-propanol + water at 60 C, Wilson: Smith, Van Ness and Abbott, Introduction to Chemical Engineering
    Thermodynamics, 7th ed., problem 12.12, printed solution; the calorie is 4.1868 J there."""
    pressure, y1 = pressure_of_propanol_water(row["x1"], 8.314 / 4.1868)
    assert pressure == pytest.approx(row["P_pub_kPa"], abs=5.1e-4)
    assert y1 == pytest.approx(row["y1_pub"], abs=5.1e-4)
    if row["x1"] > 0.0:
        assert abs(pressure_of_propanol_water(row["x1"], 8.314 / 4.1868, swap=True)[0] - row["P_pub_kPa"]) > 0.1


@pytest.mark.parametrize("row", read("wilson_nrtl_examples"), ids=lambda row: f"{row['system']} {row['x1']}")
def test_wilson_and_nrtl_examples(row: dict[str, str]) -> None:
    """Parameters of Gmehling et al. as printed in Smith, Van Ness, Abbott and Swihart, 8th ed., Table 13.10, evaluated
    with 30 digits for the data file."""
    value = numbers(row)
    factors = off_diagonal(value["Lambda12"], value["Lambda21"], 1.0)
    found = wilson_ln_gamma(pair(value["x1"]), factors)
    assert found == pytest.approx([value["lng1_Wilson"], value["lng2_Wilson"]], rel=3e-7)
    ends = [wilson_ln_gamma(pair(0.0), factors)[0], wilson_ln_gamma(pair(1.0), factors)[1]]
    assert ends == pytest.approx([value["lng1inf_Wilson"], value["lng2inf_Wilson"]], rel=3e-7)
    if "tau12" not in value:
        return
    tau = off_diagonal(value["tau12"], value["tau21"], 0.0)
    found = nrtl_ln_gamma(pair(value["x1"]), tau, value["alpha"])
    assert found == pytest.approx([value["lng1_NRTL"], value["lng2_NRTL"]], rel=3e-7)
    ends = [nrtl_ln_gamma(pair(x), tau, value["alpha"])[i] for i, x in enumerate((0.0, 1.0))]
    assert ends == pytest.approx([value["lng1inf_NRTL"], value["lng2inf_NRTL"]], rel=3e-7)
    other = nrtl_ln_gamma(pair(value["x1"]), tau, value["alpha"] + 0.01)
    assert other != pytest.approx([value["lng1_NRTL"], value["lng2_NRTL"]], rel=1e-5)


@pytest.mark.parametrize(
    "row", read("uniquac_examples"), ids=lambda row: f"{row['comp1']}+{row['comp2']} {row['x1'][:6]}"
)
def test_uniquac_examples(row: dict[str, str]) -> None:
    """Abrams and Prausnitz 1975 evaluated with 30 digits (acetonitrile + benzene parameters recalled from Prausnitz et
    al. 1980, the others arbitrary: tests/data/uniquac_examples.csv)."""
    value = numbers({key: row[key] for key in row if key != "x1"})
    r, q = np.array([value["r1"], value["r2"]]), np.array([value["q1"], value["q2"]])
    tau = np.exp(-off_diagonal(value["a12"], value["a21"], 0.0) / value["T"])
    if row["x1"].startswith("inf"):
        parts = [
            (staverman_guggenheim(pair(x), r, q, 10.0)[i], uniquac_residual(pair(x), q, tau)[i])
            for i, x in enumerate((0.0, 1.0))
        ]
        combinatorial, residual = np.array(parts).T
    else:
        x = pair(float(row["x1"]))
        combinatorial, residual = staverman_guggenheim(x, r, q, 10.0), uniquac_residual(x, q, tau)
    assert combinatorial == pytest.approx([value["lng1_comb"], value["lng2_comb"]], rel=3e-9, abs=3e-15)
    assert residual == pytest.approx([value["lng1_res"], value["lng2_res"]], rel=3e-9, abs=3e-15)
    assert staverman_guggenheim(pair(0.3), r, q, 12.0) != pytest.approx(staverman_guggenheim(pair(0.3), r, q, 10.0))


QCT = [numbers(row) for row in read("quasichemical_binary")]


def lattice(row: dict[str, float], z: float | None = None) -> ModelInput:
    """Equal sizes with w = z [e12 - (e11 + e22)/2]; contact energies e are minus our depths."""
    depth = off_diagonal(-row["w_over_kT"] / row["z"], -row["w_over_kT"] / row["z"], 0.0)
    return ModelInput(depth, np.ones(2), pair(row["x1"]), z=row["z"] if z is None else z)


@pytest.mark.parametrize("row", QCT, ids=lambda row: f"z{row['z']:g} w{row['w_over_kT']:g} x{row['x1']:g}")
def test_quasi_chemical_table(row: dict[str, float]) -> None:
    """Guggenheim, Mixtures (1952), chapter 4; verified by mole-number derivatives and U = d(G/T)/d(1/T)."""
    given = lattice(row)
    found = ln_gamma(QuasiChemical(), given, ONE)
    assert found == pytest.approx([row["lng1"], row["lng2"]], rel=1e-10, abs=1e-12)
    assert float(given.mole_fractions @ found) == pytest.approx(row["GE"], rel=1e-10)
    assert float(excess_energy(QuasiChemical(), given, ONE)) == pytest.approx(row["UE"], rel=1e-10)
    assert ln_gamma(RandomMixing(), given, ALL) != pytest.approx(found, rel=1e-3), "random mixing must be seen"


# --- exact results ------------------------------------------------------------------------------------------


def chain_excess(x1: float, w: float) -> float:
    """G_E/NkT of the exact chain (z = 2), by the largest term of its partition function.

    Among N sites in a row with N12 directed 12 contacts the number of arrangements is
    N1! N2!/[(N1-n)! (N2-n)! n! n!] with n = N12 per kind of boundary (Ising, Z. Phys. 31 (1925) 253).
    """

    def slope(n: float) -> float:
        return float(np.log((x1 - n) * (1.0 - x1 - n) / n**2) - w)

    n = brentq(slope, 1e-12, min(x1, 1.0 - x1) - 1e-12, xtol=1e-15)

    def entropy(a: float) -> float:
        return float(a * np.log(a))

    arrangements = entropy(x1) + entropy(1 - x1) - entropy(x1 - n) - entropy(1 - x1 - n) - 2 * entropy(n)
    return float(w * n - arrangements - entropy(x1) - entropy(1 - x1))


@pytest.mark.parametrize("w", [-1.5, 0.4, 1.7])
@pytest.mark.parametrize("x1", [0.05, 0.3, 0.5, 0.8])
def test_two_neighbours_give_the_exact_chain(x1: float, w: float) -> None:
    row = {"z": 2.0, "w_over_kT": w, "x1": x1}
    given = lattice(row)
    found = float(given.mole_fractions @ ln_gamma(QuasiChemical(), given, ONE))
    assert found == pytest.approx(chain_excess(x1, w), rel=1e-9)
    first = float(given.mole_fractions @ ln_gamma(FirstOrderQuasiChemical(), given, ONE))
    assert first != pytest.approx(chain_excess(x1, w), rel=1e-5)


def test_chain_value_of_the_table() -> None:
    """Own computation for the check values, both ways: 0.290583941992653 at x = 0.3, w/kT = 1.7."""
    assert chain_excess(0.3, 1.7) == pytest.approx(0.290583941992653, rel=1e-9)


def curvature(model: ActivityModel, z: float, w: float, reading: Reading = ONE) -> float:
    """d ln(x1 gamma1)/dx1 at x1 = 1/2 by a complex step: zero at the critical point of a symmetric mixture."""
    x1 = 0.5 + 1e-30j
    depth = off_diagonal(-w / z, -w / z, 0.0)
    given = ModelInput(depth, np.ones(2), np.array([x1, 1.0 - x1]), z=z)
    return float(2.0 + ln_gamma(model, given, reading)[0].imag / 1e-30)


@pytest.mark.parametrize("row", read("lattice_critical"), ids=lambda row: row["lattice"])
def test_critical_points_of_the_symmetric_mixture(row: dict[str, str]) -> None:
    """Quasi-chemical z ln[z/(z-2)] (Guggenheim 1952), Bragg-Williams 2 (Bragg and Williams, Proc. R. Soc. A 145
    (1934) 699), for the lattices of tests/data/lattice_critical.csv."""
    z = float(row["z"])
    if z > 2:
        critical = brentq(lambda w: curvature(QuasiChemical(), z, w), 0.5, 8.0)
        assert critical == pytest.approx(float(row["quasichemical"]), rel=1e-6)
        assert critical == pytest.approx(z * np.log(z / (z - 2.0)), rel=1e-10)
    else:  # the chain has no transition
        assert min(curvature(QuasiChemical(), z, w) for w in np.linspace(0.1, 8.0, 40)) > 0.0
    random = brentq(lambda w: curvature(RandomMixing(), z, w, ALL), 0.5, 8.0)
    assert random == pytest.approx(float(row["bragg_williams"]), rel=1e-10)


@pytest.mark.parametrize("sizes", [(1.0, 1.0), (1.0, 1.7), (1.3, 1.0, 1.6)])
def test_first_order_is_the_expansion_of_the_full_theory(sizes: tuple[float, ...]) -> None:
    """Guggenheim, Mixtures (1952): the difference falls with the cube of the energies in ln gamma, with their
    square in the ratios."""
    rng = np.random.default_rng(5)
    n = len(sizes)
    depth = rng.uniform(-1.0, 1.0, (n, n))
    x = rng.dirichlet(np.ones(n))
    gaps = []
    for scale in (0.02, 0.01):
        given = ModelInput(scale * (depth + depth.T), np.array(sizes), x)
        full, first = QuasiChemical(), FirstOrderQuasiChemical()
        gaps.append(
            [
                np.max(np.abs(full.residual(given, ONE) - first.residual(given, ONE))),
                np.max(np.abs(full.ratios(given, ONE) - first.ratios(given, ONE))),
            ]
        )
    cubic, square = np.array(gaps[0]) / np.array(gaps[1])
    assert cubic == pytest.approx(8.0, rel=0.1)
    assert square == pytest.approx(4.0, rel=0.1)


def test_small_energies_of_the_first_order() -> None:
    """G_E/NkT = w x1 x2 [1 - x1 x2 w/z] and U_E = w x1 x2 [1 - 2 x1 x2 w/z] (Guggenheim 1952, small w)."""
    row = {"z": 8.0, "w_over_kT": 0.7, "x1": 0.35}
    given, w, product = lattice(row), row["w_over_kT"], 0.35 * 0.65
    found = float(given.mole_fractions @ ln_gamma(FirstOrderQuasiChemical(), given, ONE))
    assert found == pytest.approx(w * product * (1.0 - product * w / 8.0), rel=1e-12)
    energy = float(excess_energy(FirstOrderQuasiChemical(), given, ONE))
    assert energy == pytest.approx(w * product * (1.0 - 2.0 * product * w / 8.0), rel=0.005)  # its own normalisation
    assert energy != pytest.approx(w * product, rel=0.01)


# --- consistency of every model -----------------------------------------------------------------------------


def random_input(species: int, seed: int, strength: float = 0.3) -> ModelInput:
    rng = np.random.default_rng(seed)
    depth = rng.uniform(0.0, strength, (species, species))
    return ModelInput(depth + depth.T, rng.uniform(1.0, 1.8, species), rng.dirichlet(3.0 * np.ones(species)), z=9.0)


def gibbs_duhem(function: Callable[[ModelInput], np.ndarray], given: ModelInput, direction: np.ndarray) -> float:
    """sum_i x_i d ln gamma_i/d xi along a direction, by a complex step (error of rounding only)."""
    step = 1e-30
    complex_fractions: Any = given.mole_fractions + 1j * step * direction
    moved = replace(given, mole_fractions=complex_fractions)
    return float(given.mole_fractions @ function(moved).imag / step)


@case
@pytest.mark.parametrize("species", [2, 3, 4])
def test_gibbs_duhem(model: ActivityModel, reading: Reading, species: int) -> None:
    for seed in range(5):
        given = random_input(species, seed)
        direction = np.random.default_rng(seed + 50).normal(size=species)
        direction -= direction.mean()
        for part in (lambda g: model.residual(g, reading), model.combinatorial):
            assert abs(gibbs_duhem(part, given, direction)) < 2e-12
        broken = gibbs_duhem(lambda g: ln_gamma(model, g, reading) + 0.01 * g.mole_fractions, given, direction)
        assert abs(broken) > 1e-8, "a wrong term must be seen"


@case
def test_pure_and_identical_species_are_ideal(model: ActivityModel, reading: Reading) -> None:
    same = ModelInput(np.full((3, 3), 0.7), np.full(3, 1.3), np.array([0.2, 0.3, 0.5]))
    assert np.max(np.abs(ln_gamma(model, same, reading))) < 1e-13
    for i in range(2):
        given = ModelInput(np.array([[0.5, 0.6], [0.6, 0.9]]), np.array([1.0, 1.4]), np.eye(2)[i])
        assert abs(float(ln_gamma(model, given, reading)[i])) < 1e-13
        assert np.all(np.isfinite(ln_gamma(model, given, reading)))


@case
def test_relabelling_and_splitting_a_species(model: ActivityModel, reading: Reading) -> None:
    given = random_input(3, 4)
    order = np.array([2, 0, 1])
    turned = ModelInput(
        given.reduced_depth[np.ix_(order, order)], given.diameter[order], given.mole_fractions[order], z=given.z
    )
    assert ln_gamma(model, turned, reading) == pytest.approx(ln_gamma(model, given, reading)[order], rel=1e-11)
    twice = np.array([0, 1, 2, 2])
    share = np.array([1.0, 1.0, 0.4, 0.6])
    split = ModelInput(
        given.reduced_depth[np.ix_(twice, twice)], given.diameter[twice], given.mole_fractions[twice] * share, z=given.z
    )
    assert ln_gamma(model, split, reading) == pytest.approx(ln_gamma(model, given, reading)[twice], rel=1e-10)


@case
def test_batches_equal_single_states(model: ActivityModel, reading: Reading) -> None:
    several = [random_input(2, seed) for seed in range(4)]
    batch = ModelInput(
        np.array([g.reduced_depth for g in several]), np.array([g.diameter for g in several]),
        np.array([g.mole_fractions for g in several]), z=np.full(4, 9.0),
    )  # fmt: skip
    for together, single in (
        (ln_gamma(model, batch, reading), [ln_gamma(model, g, reading) for g in several]),
        (model.ratios(batch, reading), [model.ratios(g, reading) for g in several]),
        (excess_energy(model, batch, reading), [excess_energy(model, g, reading) for g in several]),
    ):
        assert together == pytest.approx(np.array(single), rel=1e-12, abs=1e-14)


@case
def test_weak_attraction_gives_the_energy(model: ActivityModel, reading: Reading) -> None:
    """To first order in beta the residual G_E is the excess energy of the athermal neighbours (Zwanzig, J. Chem. Phys.
    22 (1954) 1420): the energy that the statement carries is the one in ln gamma."""
    base = random_input(2, 3)
    small = ModelInput(1e-7 * base.reduced_depth, base.diameter, base.mole_fractions, z=base.z)
    excess = float(small.mole_fractions @ model.residual(small, reading))
    energy = float(excess_energy(model, small, reading))
    if isinstance(model, Wilson):  # its excess function counts neighbours by volume, its statement by mole
        assert excess != pytest.approx(energy, rel=1e-2)
        equal = ModelInput(small.reduced_depth, np.ones(2), small.mole_fractions, z=small.z)
        excess, energy = (
            float(equal.mole_fractions @ model.residual(equal, reading)),
            float(excess_energy(model, equal, reading)),
        )
    assert excess == pytest.approx(energy, rel=2e-6, abs=0.0)
    assert excess != pytest.approx(2.0 * energy, rel=1e-2, abs=0.0)


# --- facts of the trade -------------------------------------------------------------------------------------


def energy_asymmetric(x1: float = 0.5, temperature: float = 2.5) -> ModelInput:
    """Equal sizes, eps 1 and 2, k = 0."""
    depth = np.array([[1.0, np.sqrt(2.0)], [np.sqrt(2.0), 2.0]]) / temperature
    return ModelInput(depth, np.ones(2), pair(x1))


def test_sign_of_the_excess_energy() -> None:
    """Common practice, no source: with k = 0 and an energy ratio of 2, UNIQUAC with m = z/2 gives the wrong sign, the
    quasi-chemical theory the right one, and LSG lies close to zero to positive."""
    given = energy_asymmetric()
    assert float(given.mole_fractions @ ln_gamma(Uniquac(), given, ALL)) < 0.0
    assert float(given.mole_fractions @ ln_gamma(QuasiChemical(), given, ONE)) > 0.0
    assert float(given.mole_fractions @ ln_gamma(LatticeSurface(), given, ONE)) > 0.0


def test_quasi_chemical_infinite_dilution() -> None:
    """ln gamma_inf = beta (z/2)(eps_11 + eps_22 - 2 eps_12) for equal sizes, whatever z (Guggenheim 1952)."""
    for z in (4.0, 10.0):
        base = energy_asymmetric(0.0)
        given = ModelInput(base.reduced_depth, base.diameter, base.mole_fractions, z=z)
        expected = -z * base.interchange[0, 1]
        assert float(ln_gamma(QuasiChemical(), given, ONE)[0]) == pytest.approx(expected, rel=1e-12)
        assert float(ln_gamma(Wilson(), given, ONE)[0]) != pytest.approx(expected, rel=0.05)


def test_lattice_surface_with_all_contacts_is_uniquac() -> None:
    """Vera, Sayegh and Ratcliff 1977 (recalled): the two differ in the reading only."""
    given = random_input(3, 8)
    assert ln_gamma(LatticeSurface(), given, ALL) == pytest.approx(ln_gamma(Uniquac(), given, ALL), rel=1e-13)
    assert ln_gamma(LatticeSurface(), given, ONE) != pytest.approx(ln_gamma(Uniquac(), given, ONE), rel=1e-2)


def test_flory_huggins_infinite_dilution() -> None:
    """ln(r1/r2) + 1 - r1/r2 (Flory 1942)."""
    found = flory_huggins(pair(0.0), np.array([1.0, 3.0]))
    assert float(found[0]) == pytest.approx(np.log(1 / 3) + 1 - 1 / 3, rel=1e-14)
    assert float(found[0]) != pytest.approx(np.log(3.0) + 1 - 3.0, rel=1e-2)


def test_every_model_says_what_it_is() -> None:
    for model in MODELS:
        assert model.parameters
        assert model.claims
        assert any(digit.isdigit() for digit in model.source)
    assert len({model.name for model in MODELS}) == len(MODELS)
    assert {type(m) for m in MODELS} >= {
        Wilson, Nrtl, Uniquac, LatticeSurface, QuasiChemical, FirstOrderQuasiChemical, RandomMixing
    }  # fmt: skip
