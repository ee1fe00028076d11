"""Quasi-chemical theory against tabulated neighbours, its own balances, and extreme energies."""

from __future__ import annotations

import numpy as np
import pytest

from localcomp.models import ActivityModel, ModelInput, Nrtl, QuasiChemical, Reading, Wilson, compare
from localcomp.models.quasichemical import LARGEST_EXPONENT, contact_factors
from tests.readers import numbers, read

ONE_CONTACT = Reading.ONE_CONTACT
ROWS = [numbers(row) for row in read("quasichemical_binary")]


def local_fractions(model: ActivityModel, given: ModelInput) -> np.ndarray:
    """X_ij = x_j R_ij/sum_k x_k R_ik as the model states it, row = centre."""
    weights = given.mole_fractions[None, :] * model.ratios(given, ONE_CONTACT)
    return weights / weights.sum(axis=1, keepdims=True)


def binary(row: dict[str, float]) -> ModelInput:
    """Equal sizes with w = z [e12 - (e11 + e22)/2]; contact energies e are minus our depths."""
    own = np.array([1.0, 2.3])
    unlike = own.mean() - row["w_over_kT"] / row["z"]
    depth = np.array([[own[0], unlike], [unlike, own[1]]])
    return ModelInput(depth, np.ones(2), np.array([row["x1"], 1.0 - row["x1"]]))


@pytest.mark.parametrize("row", ROWS, ids=lambda row: f"z{row['z']:g} w{row['w_over_kT']:g} x{row['x1']:g}")
def test_neighbours_of_the_closed_form(row):
    """Guggenheim, Mixtures (1952): neighbours of a 1 that are 2 = 2 x2/(B + 1)."""
    found = local_fractions(QuasiChemical(), binary(row))
    expected = np.array([row["x21loc"], row["x12loc"]])
    assert np.array([found[0, 1], found[1, 0]]) == pytest.approx(expected, rel=1e-10)


@pytest.mark.parametrize("model", [Wilson(), Nrtl(0.3)], ids=lambda model: model.label)
def test_other_models_fail_the_closed_form(model):
    row = next(r for r in ROWS if (r["z"], r["w_over_kT"], r["x1"]) == (4, 1.5, 0.25))
    found = local_fractions(model, binary(row))
    assert abs(found[0, 1] - row["x21loc"]) > 0.02


def random_input(rng: np.random.Generator, species: int, strength: float = 1.5) -> ModelInput:
    depth = rng.uniform(-strength, strength, (species, species))
    fractions = rng.dirichlet(np.ones(species))
    return ModelInput(depth + depth.T, rng.uniform(0.7, 2.0, species), fractions)


def pair_gap(model: ActivityModel, given: ModelInput) -> float:
    """Largest relative difference between the contacts counted from both ends: q_i x_i X_ij and q_j x_j X_ji."""
    pairs = (given.diameter**2 * given.mole_fractions)[:, None] * local_fractions(model, given)
    return float(np.max(np.abs(pairs - pairs.T) / np.maximum(pairs, pairs.T)))


@pytest.mark.parametrize("species", [2, 3, 5])
def test_pairs_balance_for_the_quasi_chemical_model_only(species):
    """N_ij = z q_i X_ij must count the same pairs from both ends (Guggenheim 1952; Wilson's model does not)."""
    rng = np.random.default_rng(species)
    for _ in range(20):
        given = random_input(rng, species)
        assert pair_gap(QuasiChemical(), given) < 1e-11
        assert pair_gap(Wilson(), given) > 1e-3


def test_invariant_is_free_of_composition_and_size():
    """R_12 R_21 = exp[beta (2 eps_12 - eps_11 - eps_22)], from N_ij = z q_i theta_j G_i G_j exp(beta eps_ij)."""
    rng = np.random.default_rng(8)
    for _ in range(50):
        given = random_input(rng, 2)
        e = given.reduced_depth
        ratio = QuasiChemical().ratios(given, ONE_CONTACT)
        assert ratio[0, 1] * ratio[1, 0] == pytest.approx(np.exp(2 * e[0, 1] - e[0, 0] - e[1, 1]), rel=1e-11)
        assert np.diag(ratio) == pytest.approx(1.0, rel=1e-14)
        nrtl = Nrtl(0.3).ratios(given, ONE_CONTACT)
        assert nrtl[0, 1] * nrtl[1, 0] != pytest.approx(ratio[0, 1] * ratio[1, 0], rel=1e-3)


def test_no_energy_differences_leave_the_surfaces():
    given = ModelInput(np.full((3, 3), 0.8), np.array([1.0, 1.5, 2.0]), np.array([0.2, 0.3, 0.5]))
    surface = given.diameter**2
    assert QuasiChemical().ratios(given, ONE_CONTACT) == pytest.approx(surface[None, :] / surface[:, None])
    assert Wilson().ratios(given, ONE_CONTACT) == pytest.approx(1.0)


@pytest.mark.parametrize("strength", [1.0, 5.0, LARGEST_EXPONENT])
def test_contact_factors_are_found_whatever_the_energies(strength):
    rng = np.random.default_rng(3)
    for n in range(300):
        species = int(rng.integers(1, 6))
        theta = rng.dirichlet(np.ones(species))
        if n % 3 == 0 and species > 1:
            theta[0] = 0.0
            theta /= theta.sum()
        exponent = rng.uniform(-strength, strength, (species, species))
        exponent = 0.5 * (exponent + exponent.T)
        np.fill_diagonal(exponent, 0.0)
        boltzmann = np.exp(exponent)
        g = contact_factors(theta, boltzmann)
        assert np.all(g > 0.0)
        assert np.max(np.abs(g * (boltzmann @ (theta * g)) - 1.0)) < 1e-13


def test_beyond_floating_point_there_is_no_number_and_no_warning():
    high = -1000.0 * np.eye(2) - 400.0 * (1.0 - np.eye(2))
    given = ModelInput(high, np.ones(2), np.array([0.5, 0.5]))
    table = compare(np.ones((2, 2)), given, (Wilson(), QuasiChemical()))
    assert np.isnan(table[-1].stated).all()
    assert np.isinf(table[1].stated[0, 1]), "Wilson with all contacts states more than a float can hold"


def test_readings_and_sources_are_given():
    one, all_contacts = Reading
    given = random_input(np.random.default_rng(1), 3, 0.3)
    assert float(one.contacts(10.0)) == 1.0
    assert float(all_contacts.contacts(10.0)) == 5.0
    assert Wilson().ratios(given, all_contacts) == pytest.approx(Wilson().ratios(given, one) ** 5, rel=1e-12)
    assert Nrtl(1.0).ratios(given, one) == pytest.approx(Wilson().ratios(given, one), rel=1e-15)
    for model, author in ((Wilson(), "Wilson"), (Nrtl(), "Renon"), (QuasiChemical(), "Guggenheim")):
        assert author in model.source
