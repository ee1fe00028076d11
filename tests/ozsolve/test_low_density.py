"""Low density: virial coefficients and neighbour counts against closed forms."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest

from ozsolve import Mixture, PairOverride, Solution, State, solve
from ozsolve import reference as exact
from tests.readers import numbers, read

B0 = 2.0 * math.pi / 3.0
DENSITIES = np.array([0.0005, 0.0010, 0.0015, 0.0020, 0.0025])
WELLS = [(1.25, 1.0), (1.25, 1.5), (1.5, 1.0), (1.5, 1.5), (1.5, 2.0), (1.75, 1.5), (1.75, 3.0), (2.0, 2.0)]
B2_TOLERANCE, B3_TOLERANCE = 1e-6, 3e-4
"""Absolute, in units of b0 and b0^2; the series cut after the fifth virial coefficient leaves up to 2e-4 in B3."""
COUNTS = read("sw_mix_coordination_lowdensity")
MEAN_SPHERICAL = [numbers(row) for row in read("sw_msa_b2_b3")]


def series(read_off: Callable[[Solution], float], closure: str, reach: float, temperature: float) -> np.ndarray:
    """Coefficients of 1, rho, rho^2 in a number that is a power series in the density."""
    values = [
        read_off(
            solve(Mixture(1.0, 1.0, reach), State(temperature, density=float(rho)), closure=closure, accuracy=1e-9)
        )
        for rho in DENSITIES
    ]
    return np.polynomial.polynomial.polyfit(DENSITIES, values, 4)


def check_third_virial(b2: float, b3: float, found: np.ndarray, weight: tuple[float, float]) -> None:
    assert found[0] == pytest.approx(1.0, abs=1e-7)
    assert found[1] / (weight[0] * B0) == pytest.approx(b2, abs=B2_TOLERANCE)
    assert found[2] / (weight[1] * B0**2) == pytest.approx(b3, abs=B3_TOLERANCE)


COMPRESSIBILITY = (lambda s: s.inverse_compressibility, (2.0, 3.0))  # 1 + 2 B2 rho + 3 B3 rho^2
VIRIAL = (lambda s: s.virial_z, (1.0, 1.0))  # 1 + B2 rho + B3 rho^2


@pytest.mark.parametrize("route", [COMPRESSIBILITY, VIRIAL], ids=["compressibility", "virial"])
@pytest.mark.parametrize("closure", ["py", "hnc", "rhnc"])
@pytest.mark.parametrize(("reach", "temperature"), WELLS)
def test_third_virial_coefficient(route, closure: str, reach: float, temperature: float) -> None:
    """Exact in PY and HNC by both routes; Kihara, Rev. Mod. Phys. 25 (1953) 831. In RHNC too: the bridge
    function begins at the square of the density."""
    read_off, weight = route
    b2, b3 = exact.square_well_b2(reach, 1.0 / temperature), exact.square_well_b3(reach, 1.0 / temperature)
    check_third_virial(b2, b3, series(read_off, closure, reach, temperature), weight)


@pytest.mark.parametrize("row", MEAN_SPHERICAL, ids=lambda r: f"{r['lambda']}-{r['Tstar']}")
def test_mean_spherical_virials(row: dict[str, float]) -> None:
    """MSA's own closed form, compressibility route (derived from the closure, checked by quadrature)."""
    found = series(COMPRESSIBILITY[0], "msa", row["lambda"], row["Tstar"])
    check_third_virial(row["B2_compr"], row["B3_compr"], found, COMPRESSIBILITY[1])
    assert exact.msa_b2_compressibility(row["lambda"], 1.0 / row["Tstar"]) == pytest.approx(row["B2_compr"], abs=1e-9)
    assert exact.msa_b3_compressibility(row["lambda"], 1.0 / row["Tstar"]) == pytest.approx(row["B3_compr"], abs=1e-9)


def test_the_virial_check_tells_closures_apart() -> None:
    found = series(COMPRESSIBILITY[0], "msa", 1.5, 1.5)
    b2, b3 = exact.square_well_b2(1.5, 1 / 1.5), exact.square_well_b3(1.5, 1 / 1.5)
    with pytest.raises(AssertionError):
        check_third_virial(b2, b3, found, (2.0, 3.0))
    own = exact.msa_b2_compressibility(1.5, 1 / 1.5), exact.msa_b3_compressibility(1.5, 1 / 1.5)
    check_third_virial(*own, found, (2.0, 3.0))
    with pytest.raises(AssertionError):  # the third coefficient alone is enough to tell
        check_third_virial(own[0], b3, found, (2.0, 3.0))
    with pytest.raises(AssertionError):  # and so is a well wider by 0.1 %
        check_third_virial(b2, b3, series(COMPRESSIBILITY[0], "py", 1.5015, 1.5), (2.0, 3.0))


def test_closed_forms_against_the_table() -> None:
    """Kihara (1953); Hirschfelder, Curtiss and Bird (1954), chapter 3 (table checked by quadrature)."""
    for row in map(numbers, read("sw_b2_b3")):
        depth = 0.0 if math.isinf(row["Tstar"]) else 1.0 / row["Tstar"]
        assert exact.square_well_b2(row["lambda"], depth) == pytest.approx(row["B2_over_b0"], abs=1e-8)
        if row["lambda"] <= 2.0:
            assert exact.square_well_b3(row["lambda"], depth) == pytest.approx(row["B3_over_b0sq"], abs=1e-7)


def low_density_counts(row: dict[str, str], closure: str) -> tuple[float, float, float]:
    """K_ij at zero density and its slopes by rho_1 and rho_2, from solves at a few small densities."""
    number = numbers(row)
    i, j = int(row["ij"][0]) - 1, int(row["ij"][1]) - 1
    mixture = Mixture(
        [1.0, number["sigma22"]],
        [number["eps11"], number["eps22"]],
        overrides=[PairOverride(0, 1, well_depth=number["eps12"])],
    )

    def integral(rho_1: float, rho_2: float) -> float:
        total = rho_1 + rho_2
        state = State(number["T"], (rho_1 / total, rho_2 / total), density=total)
        return float(solve(mixture, state, closure=closure, accuracy=1e-9).observables.shell_integral[i, j])

    # The leading density has to sit well below the smallest second-order effect of the big sphere.
    steps = np.array([1.0, 2.0, 3.0, 4.0]) * 4e-4 / max(1.0, number["sigma22"] ** 3)
    along_1 = np.polynomial.polynomial.polyfit(steps, [integral(h, 0.0) for h in steps], 3)
    along_2 = np.polynomial.polynomial.polyfit(steps, [integral(0.0, h) for h in steps], 3)
    return float(along_1[0]), float(along_1[1]), float(along_2[1])


def check_counts(expected: tuple[float, float, float], found: tuple[float, float, float]) -> None:
    assert found[0] == pytest.approx(expected[0], rel=1e-7)
    largest = max(abs(slope) for slope in expected[1:])
    for slope, value in zip(expected[1:], found[1:], strict=True):
        assert value == pytest.approx(slope, abs=2e-5 * largest)


@pytest.mark.parametrize("row", COUNTS, ids=lambda r: f"{r['case']}-{r['T']}-{r['ij']}")
def test_neighbour_counts_to_second_order(row: dict[str, str]) -> None:
    """Density expansion (exact, hence PY: columns K; MSA: columns M), closed form by triple overlaps of
    spheres; Kihara (1953), Hirschfelder, Curtiss and Bird (1954) (memory), computed for the table."""
    number = numbers(row)
    check_counts((number["K0"], number["K1_1"], number["K1_2"]), low_density_counts(row, "py"))
    check_counts((number["M0"], number["M1_1"], number["M1_2"]), low_density_counts(row, "msa"))


def test_the_count_check_tells_closures_and_species_apart() -> None:
    row = COUNTS[-1]
    number = numbers(row)
    right, mean = low_density_counts(row, "py"), low_density_counts(row, "msa")
    check_counts((number["K0"], number["K1_1"], number["K1_2"]), right)
    with pytest.raises(AssertionError):
        check_counts((number["K0"], number["K1_1"], number["K1_2"]), mean)
    with pytest.raises(AssertionError):  # the slopes alone are enough to tell
        check_counts((number["K0"], number["K1_1"], number["K1_2"]), (right[0], *mean[1:]))
    with pytest.raises(AssertionError):  # species swapped
        check_counts((number["K0"], number["K1_2"], number["K1_1"]), right)


@pytest.mark.parametrize("row", COUNTS, ids=lambda r: f"{r['case']}-{r['T']}-{r['ij']}")
def test_density_expansion_as_coded_against_the_table(row: dict[str, str]) -> None:
    number = numbers(row)
    i, j = int(row["ij"][0]) - 1, int(row["ij"][1]) - 1
    core = np.array([[1.0, 0.5 + number["sigma22"] / 2], [0.5 + number["sigma22"] / 2, number["sigma22"]]])
    depth = np.array([[number["eps11"], number["eps12"]], [number["eps12"], number["eps22"]]])
    for letter, mean_spherical in (("K", False), ("M", True)):
        zeroth, first = exact.low_density_shells(core, 1.5 * core, depth / number["T"], mean_spherical)
        assert zeroth[i, j] == pytest.approx(number[f"{letter}0"], rel=1e-8)
        slopes = np.array([number[f"{letter}1_1"], number[f"{letter}1_2"]])
        assert np.max(np.abs(first[i, j] - slopes)) < 2e-8 * np.abs(slopes).max()
        with pytest.raises(AssertionError):
            assert zeroth[i, j] == pytest.approx(number["M0" if letter == "K" else "K0"], rel=1e-8)


@pytest.mark.parametrize("closure", ["py", "hnc", "rhnc", "msa"])
def test_counts_with_a_shoulder_and_unequal_ranges(closure: str) -> None:
    """The same expansion where the table does not reach; HNC and RHNC share it with PY."""
    mixture = Mixture([1.0, 1.3], [1.0, -0.5], [1.5, 1.35], overrides=[PairOverride(0, 1, well_depth=0.4)])
    pairs, x, temperature = mixture.pairs, np.array([0.4, 0.6]), 1.5
    zeroth, first = exact.low_density_shells(
        pairs.diameter, pairs.well_edge, pairs.well_depth / temperature, closure == "msa"
    )
    densities = 2e-4 * np.array([1.0, 2.0, 3.0, 4.0])
    found = np.array(
        [
            solve(mixture, State(temperature, tuple(x), density=float(rho)), closure=closure, accuracy=1e-9)
            .observables.shell_integral.ravel()
            for rho in densities
        ]
    )  # fmt: skip
    fit = np.polynomial.polynomial.polyfit(densities, found, 3)
    slope = first @ x
    assert np.max(np.abs(fit[0] / zeroth.ravel() - 1.0)) < 1e-7
    assert np.max(np.abs(fit[1] - slope.ravel())) < 2e-5 * np.abs(slope).max()
    other = exact.low_density_shells(
        pairs.diameter, pairs.well_edge, pairs.well_depth / temperature, closure != "msa"
    )  # fmt: skip
    assert np.max(np.abs(fit[0] / other[0].ravel() - 1.0)) > 1e-3
    assert np.max(np.abs(fit[1] - (other[1] @ x).ravel())) > 2e-3 * np.abs(slope).max()


STICKY = [numbers(row) for row in read("sticky_spheres_py")]
STICKY_TOLERANCE = 2e-3
"""Relative; what curvature in the width leaves of a linear extrapolation from 0.005 and 0.01 is up to 1.2e-3."""


def narrow_well(tau: float, eta: float, width: float, closure: str) -> np.ndarray:
    """Inverse compressibility and neighbours in the well, tau fixed by equal second virial coefficient."""
    depth = exact.sticky_depth(1.0 + width, tau)
    mixture, state = Mixture(1.0, 1.0, 1.0 + width), State(1.0 / depth, packing_fraction=eta)
    found = solve(mixture, state, closure=closure, accuracy=1e-6)
    return np.array([found.inverse_compressibility, float(found.densities[0] * found.observables.shell_integral[0, 0])])


def sticky_limit(tau: float, eta: float, width: float = 0.005, closure: str = "py") -> np.ndarray:
    """`narrow_well` at one width and its double, extrapolated linearly in lam - 1 to 0."""
    return 2.0 * narrow_well(tau, eta, width, closure) - narrow_well(tau, eta, 2.0 * width, closure)


def check_sticky(row: dict[str, float], found: np.ndarray) -> None:
    """Baxter, J. Chem. Phys. 49 (1968) 2770, Percus-Yevick."""
    assert found[0] == pytest.approx(row["dbPdrho"], rel=STICKY_TOLERANCE)
    assert found[1] == pytest.approx(row["n_bond"], rel=STICKY_TOLERANCE)


@pytest.mark.parametrize("row", STICKY, ids=lambda r: f"{r['tau']}-{r['eta']}")
def test_narrow_wells_approach_sticky_spheres(row: dict[str, float]) -> None:
    """At equal second virial coefficient the correction is linear in the width (Largo, Miller and Sciortino,
    J. Chem. Phys. 128 (2008) 134513, at the critical point)."""
    check_sticky(row, sticky_limit(row["tau"], row["eta"]))


def test_the_sticky_check_can_fail() -> None:
    row = STICKY[7]  # tau 0.15, eta 0.2
    for wrong in (
        narrow_well(row["tau"], row["eta"], 0.01, "py"),  # not extrapolated
        sticky_limit(1.05 * row["tau"], row["eta"]),
        sticky_limit(row["tau"], row["eta"], closure="hnc"),
    ):
        with pytest.raises(AssertionError):
            check_sticky(row, wrong)


def test_the_remainder_of_the_sticky_limit_is_quadratic_in_the_width() -> None:
    row = STICKY[14]  # tau 0.2, eta 0.4
    wide, narrow = (abs(sticky_limit(row["tau"], row["eta"], w)[0] / row["dbPdrho"] - 1.0) for w in (0.02, 0.01))
    assert 3.0 < wide / narrow < 5.0


def test_sticky_closed_form_against_its_table() -> None:
    for row in STICKY:
        lam, bonded, inverse = exact.sticky_spheres(row["eta"], row["tau"])
        assert lam == pytest.approx(row["lambda_B"], rel=1e-8)
        assert bonded == pytest.approx(row["n_bond"], rel=1e-8)
        assert inverse == pytest.approx(row["dbPdrho"], rel=1e-8)
