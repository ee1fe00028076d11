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
DENSITIES = np.array([0.002, 0.004, 0.006, 0.008, 0.010])
WELLS = [(1.25, 1.5), (1.5, 1.5), (1.5, 2.0), (1.75, 3.0)]
COUNTS = read("sw_mix_coordination_lowdensity")


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
    assert found[1] / (weight[0] * B0) == pytest.approx(b2, abs=1e-5)
    assert found[2] / (weight[1] * B0**2) == pytest.approx(b3, abs=1e-3)


COMPRESSIBILITY = (lambda s: s.inverse_compressibility, (2.0, 3.0))  # 1 + 2 B2 rho + 3 B3 rho^2
VIRIAL = (lambda s: s.virial_z, (1.0, 1.0))  # 1 + B2 rho + B3 rho^2


@pytest.mark.parametrize("route", [COMPRESSIBILITY, VIRIAL], ids=["compressibility", "virial"])
@pytest.mark.parametrize("closure", ["py", "hnc"])
@pytest.mark.parametrize(("reach", "temperature"), WELLS)
def test_third_virial_coefficient(route, closure: str, reach: float, temperature: float) -> None:
    """Exact in PY and HNC by both routes; Kihara, Rev. Mod. Phys. 25 (1953) 831."""
    read_off, weight = route
    b2, b3 = exact.square_well_b2(reach, 1.0 / temperature), exact.square_well_b3(reach, 1.0 / temperature)
    check_third_virial(b2, b3, series(read_off, closure, reach, temperature), weight)


@pytest.mark.parametrize("row", [numbers(r) for r in read("sw_msa_b2_b3")][:8], ids=lambda r: str(list(r.values())[:2]))
def test_mean_spherical_virials(row: dict[str, float]) -> None:
    """MSA's own closed form, compressibility route (derived from the closure, checked by quadrature)."""
    found = series(COMPRESSIBILITY[0], "msa", row["lambda"], row["Tstar"])
    check_third_virial(row["B2_compr"], row["B3_compr"], found, COMPRESSIBILITY[1])
    assert exact.msa_b3_compressibility(row["lambda"], 1.0 / row["Tstar"]) == pytest.approx(row["B3_compr"], abs=1e-9)


def test_the_virial_check_tells_closures_apart() -> None:
    found = series(COMPRESSIBILITY[0], "msa", 1.5, 1.5)
    with pytest.raises(AssertionError):
        check_third_virial(exact.square_well_b2(1.5, 1 / 1.5), exact.square_well_b3(1.5, 1 / 1.5), found, (2.0, 3.0))


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
    assert found[0] == pytest.approx(expected[0], rel=1e-6)
    for slope, value in zip(expected[1:], found[1:], strict=True):
        assert value == pytest.approx(slope, abs=2e-3 * max(1.0, abs(expected[0])))


@pytest.mark.parametrize("row", COUNTS, ids=lambda r: f"{r['case']}-{r['T']}-{r['ij']}")
def test_neighbour_counts_to_second_order(row: dict[str, str]) -> None:
    """Density expansion (exact, hence PY: columns K; MSA: columns M), closed form by triple overlaps of
    spheres; Kihara (1953), Hirschfelder, Curtiss and Bird (1954) (memory), computed for the table."""
    number = numbers(row)
    check_counts((number["K0"], number["K1_1"], number["K1_2"]), low_density_counts(row, "py"))
    check_counts((number["M0"], number["M1_1"], number["M1_2"]), low_density_counts(row, "msa"))


def test_the_count_check_tells_closures_apart() -> None:
    number = numbers(COUNTS[0])
    with pytest.raises(AssertionError):
        check_counts((number["K0"], number["K1_1"], number["K1_2"]), low_density_counts(COUNTS[0], "msa"))


def sticky_limit(tau: float, eta: float, widths: list[float]) -> tuple[float, float]:
    """Inverse compressibility and bonded neighbours of PY wells, extrapolated in lam - 1 to zero width."""
    inverse, bonded = [], []
    for width in widths:
        depth = exact.sticky_depth(1.0 + width, tau)
        solution = solve(Mixture(1.0, 1.0, 1.0 + width), State(1.0 / depth, packing_fraction=eta), closure="py")
        inverse.append(solution.inverse_compressibility)
        bonded.append(float(solution.densities[0] * solution.observables.shell_integral[0, 0]))
    fits = [np.polynomial.polynomial.polyfit(widths, values, 2)[0] for values in (inverse, bonded)]
    return float(fits[0]), float(fits[1])


def check_sticky(tau: float, eta: float, found: tuple[float, float]) -> None:
    _, bonded, inverse = exact.sticky_spheres(eta, tau)
    assert found[0] == pytest.approx(inverse, rel=5e-3)
    assert found[1] == pytest.approx(bonded, rel=5e-3)


@pytest.mark.parametrize(("tau", "eta"), [(0.2, 0.1), (0.2, 0.3), (0.5, 0.2), (0.5, 0.4)])
def test_narrow_wells_approach_sticky_spheres(tau: float, eta: float) -> None:
    """Baxter, J. Chem. Phys. 49 (1968) 2770, at equal second virial coefficient; the correction is smooth in
    the width (Largo, Miller and Sciortino, J. Chem. Phys. 128 (2008) 134513: linear), so extrapolate."""
    found = sticky_limit(tau, eta, [0.01, 0.02, 0.03, 0.04])
    check_sticky(tau, eta, found)
    with pytest.raises(AssertionError):
        check_sticky(1.2 * tau, eta, found)


def test_sticky_closed_form_against_its_table() -> None:
    for row in map(numbers, read("sticky_spheres_py")):
        lam, bonded, inverse = exact.sticky_spheres(row["eta"], row["tau"])
        assert lam == pytest.approx(row["lambda_B"], rel=1e-8)
        assert bonded == pytest.approx(row["n_bond"], rel=1e-8)
        assert inverse == pytest.approx(row["dbPdrho"], rel=1e-8)
