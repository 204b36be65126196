"""The reference tables against exact and published values."""

from __future__ import annotations

from importlib import resources

import numpy as np
import pytest

from lbwork.errors import UsageError
from lbwork.levels import reference, reference_density, reference_names
from lbwork.levels.references import SPACING_GRID, systematic

# Values sampled independently at 500 levels (<r>, <cos>, <r^2>, <r^3>, <cos 2 theta>); they agree
# with the digits of L. Sa, P. Ribeiro, T. Prosen, Phys. Rev. X 10, 021019 (2020), <r> 0.738 and
# <cos> -0.241 for class A, and with 0.722, -0.193 (AI-dagger) and 0.749, -0.284 (AII-dagger),
# K. Kawabata et al., PRX Quantum 4, 030328 (2023); from memory.
SAMPLED = {
    "A": (0.7379, -0.246, 0.5799, 0.4756, -0.102),
    "AI+": (0.7216, -0.194, 0.5598, 0.4555, -0.086),
    "AII+": (0.7464, -0.285, 0.591, 0.487, -0.107),
}
PUBLISHED = {"A": (0.738, -0.241), "AI+": (0.722, -0.193), "AII+": (0.749, -0.284)}
# Atas, Bogomolny, Giraud, Roux, Phys. Rev. Lett. 110, 084101 (2013); from memory.
GAP_RATIOS = {
    "1d-poisson": 2.0 * np.log(2.0) - 1.0,
    "1d-GOE": 0.5307,
    "1d-GUE": 0.5996,
    "1d-GSE": 0.6744,
}


def test_independent_levels_have_the_exact_moments() -> None:
    # Flat in the unit disc: 2/3, 0, 1/2, 2/5, 0 (exact).
    values, errors = reference("poisson").moments.T
    np.testing.assert_array_less(np.abs(values - (2 / 3, 0, 1 / 2, 2 / 5, 0)), 4 * errors + 1e-3)


@pytest.mark.parametrize("name", SAMPLED)
def test_classes_reproduce_the_sampled_moments(name: str) -> None:
    values, errors = reference(name).moments.T
    assert np.all(errors < (0.0015, 0.005, 0.002, 0.002, 0.005))
    np.testing.assert_allclose(values, SAMPLED[name], atol=0.006)


@pytest.mark.parametrize("name", PUBLISHED)
def test_classes_reproduce_the_published_digits(name: str) -> None:
    values, errors = reference(name).moments.T
    np.testing.assert_array_less(np.abs(values[:2] - PUBLISHED[name]), 3 * errors[:2] + 2e-3)


@pytest.mark.parametrize("name", GAP_RATIOS)
def test_lines_reproduce_the_published_gap_ratio(name: str) -> None:
    value, error = reference(name).moments[0]
    # The values for matrices are surmises, good to two units of the third digit.
    assert abs(value - GAP_RATIOS[name]) < 3 * error + 2e-3


def test_the_classes_are_ordered_by_repulsion() -> None:
    names = ("poisson", "AI+", "A", "AII+")
    assert np.all(np.diff([reference(name).moments[0, 0] for name in names]) > 0)
    assert np.all(np.diff([reference(name).moments[1, 0] for name in names]) < 0)


def test_superpositions_tend_to_independent_levels() -> None:
    cosines = [reference(name).moments[1, 0] for name in ("A", "A x2", "A x3", "A x4", "poisson")]
    assert np.all(np.diff(cosines) > 0)


def test_the_spacings_of_class_a_follow_the_exact_distribution() -> None:
    # 1 - prod_n e_n(s^2) exp(-s^2), R. Grobe, F. Haake, H.-J. Sommers, Phys. Rev. Lett. 61, 1899
    # (1988); from memory. Local unfolding narrows the distribution a little.
    grid = np.linspace(0.0, 4.0, 2001)
    survival = np.ones_like(grid)
    partial, term = np.ones_like(grid), np.ones_like(grid)
    for order in range(1, 60):
        term = term * grid**2 / order
        partial = partial + term
        survival *= partial * np.exp(-(grid**2))
    mean = np.trapezoid(survival, grid)
    exact = 1.0 - np.interp(SPACING_GRID * mean, grid, survival)
    np.testing.assert_allclose(reference("A").spacing_cdf, exact, atol=0.012)


@pytest.mark.parametrize("name", reference_names("plane"))
def test_densities_are_normalised(name: str) -> None:
    r_edges, theta_edges, pdf = reference_density(name)
    area = np.outer(np.diff(r_edges**2) / 2.0, np.diff(theta_edges))
    assert 2.0 * np.sum(pdf * area) == pytest.approx(1.0, abs=1e-5)
    assert np.all(pdf >= 0)


def test_the_density_of_independent_levels_is_flat() -> None:
    _, _, pdf = reference_density("poisson")
    np.testing.assert_allclose(pdf[5:] * np.pi, 1.0, atol=0.12)


def test_the_density_of_class_a_vanishes_at_the_origin_and_at_small_angles() -> None:
    _, _, pdf = reference_density("A")
    assert np.max(pdf[:2]) < 0.05
    assert np.mean(pdf[-4:, :2]) < 0.3 * np.mean(pdf[-4:, 9:])


@pytest.mark.parametrize("name", reference_names("plane") + reference_names("line"))
def test_covariances_are_positive_definite(name: str) -> None:
    one = reference(name)
    assert np.all(np.linalg.eigvalsh(one.covariance) > 0)
    assert np.all(np.linalg.eigvalsh(systematic(one.geometry)) > -1e-12)


def test_the_tables_are_small() -> None:
    tables = resources.files("lbwork.levels").joinpath("reference_tables.npz").read_bytes()
    assert len(tables) < 300_000


def test_unknown_references_are_named() -> None:
    with pytest.raises(UsageError, match="unknown reference 'B'"):
        reference("B")
    with pytest.raises(UsageError, match="lives on a line"):
        reference_density("1d-GOE")
