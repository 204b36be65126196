"""Ratios, spacings, local fields and the form factor on configurations with known answers."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.special import gamma

from lbwork.errors import UsageError
from lbwork.levels import dissipative_form_factor
from lbwork.levels.descriptors import PLANE_NAMES, local_field, plane_descriptors
from lbwork.levels.ensembles import independent_levels, sample_levels
from lbwork.levels.neighbours import edge_offset, neighbourhood
from lbwork.levels.ratios import complex_spacing_ratios, gap_ratios
from lbwork.levels.spacings import line_spacings, plane_spacings


def torus_copies(levels: np.ndarray) -> np.ndarray:
    """Levels of the unit square with their eight periodic images; the originals come first."""
    shifts = [a + 1j * b for a in (0, 1, -1) for b in (0, 1, -1)]
    return np.concatenate([levels + shift for shift in shifts])


def test_ratio_of_a_hand_made_configuration() -> None:
    levels = np.array([0.0, 1.0, 2.0j, 10.0 + 10.0j], dtype=complex)
    ratios = complex_spacing_ratios(neighbourhood(levels, 3))
    assert ratios[0] == pytest.approx(1.0 / 2.0j)
    assert ratios[1] == pytest.approx(-1.0 / (2.0j - 1.0))


def test_ratios_do_not_see_scale_rotation_or_shift() -> None:
    levels = independent_levels(200, np.random.default_rng(1))
    moved = 3.7 * np.exp(0.4j) * levels + 5.0 - 2.0j
    first = complex_spacing_ratios(neighbourhood(levels))
    second = complex_spacing_ratios(neighbourhood(moved))
    np.testing.assert_allclose(first, second, atol=1e-10)


def test_descriptors_do_not_see_scale_rotation_or_shift() -> None:
    levels = independent_levels(200, np.random.default_rng(2))
    moved = 0.1 * np.exp(2.1j) * levels - 1.0 + 4.0j
    first = plane_descriptors(neighbourhood(levels))
    second = plane_descriptors(neighbourhood(moved))
    assert first.shape == (200, len(PLANE_NAMES))
    np.testing.assert_allclose(first, second, atol=1e-9)


def test_local_field_vanishes_on_a_lattice() -> None:
    side = np.arange(15) * (1.0 + 1e-9 * np.arange(15))
    levels = (side[:, None] + 1j * side[None, :]).ravel()
    near = neighbourhood(levels)
    centre = int(np.argmin(np.abs(levels - (7.0 + 7.0j))))
    assert abs(local_field(near)[centre]) < 1e-6


def test_edge_offset_of_a_straight_edge_and_of_an_outlier() -> None:
    # Centroid of a half disc: 4 / (3 pi) of its radius, exact.
    levels = independent_levels(60000, np.random.default_rng(3))
    half = np.append(levels[levels.real > 0], [0.0, -3.0])
    offset = edge_offset(neighbourhood(half, 400))
    assert offset[-2] == pytest.approx(4.0 / (3.0 * np.pi), abs=0.04)
    assert offset[-1] > 0.9


def test_independent_levels_have_the_exact_ratio_moments() -> None:
    # z of independent points is uniform in the unit disc: 2/3, 0 and 1/2 (exact).
    generator = np.random.default_rng(4)
    levels = generator.uniform(size=(2, 6000))
    ratios = complex_spacing_ratios(neighbourhood(torus_copies(levels[0] + 1j * levels[1])))[:6000]
    assert np.mean(np.abs(ratios)) == pytest.approx(2.0 / 3.0, abs=0.012)
    assert np.mean(np.cos(np.angle(ratios))) == pytest.approx(0.0, abs=0.04)
    assert np.mean(np.abs(ratios) ** 2) == pytest.approx(0.5, abs=0.015)


@pytest.mark.parametrize("neighbours", [8, 24, 60])
def test_independent_levels_have_the_exact_spacing_moments(neighbours: int) -> None:
    # s^2 = (K/pi) Beta(1, K-1), <s> = sqrt(K/pi) Gamma(3/2) Gamma(K) / Gamma(K + 1/2) (exact).
    generator = np.random.default_rng(5)
    levels = generator.uniform(size=(2, 6000))
    near = neighbourhood(torus_copies(levels[0] + 1j * levels[1]), neighbours)
    spacings = plane_spacings(near)[:6000]
    mean = np.sqrt(neighbours / np.pi) * gamma(1.5) * gamma(neighbours) / gamma(neighbours + 0.5)
    variance = 1.0 / np.pi - mean**2
    assert np.mean(spacings) == pytest.approx(mean, abs=0.012)
    assert np.var(spacings) / mean**2 == pytest.approx(variance / mean**2, abs=0.015)


def test_spacing_variance_tends_to_the_flat_one() -> None:
    # Without unfolding the variance of independent points is 4/pi - 1 = 0.2732 at mean 1 (exact).
    generator = np.random.default_rng(6)
    levels = generator.uniform(size=(2, 8000))
    near = neighbourhood(torus_copies(levels[0] + 1j * levels[1]), 4)
    distance = near.distance[:8000, 0]
    assert np.var(distance / np.mean(distance)) == pytest.approx(4.0 / np.pi - 1.0, abs=0.015)


def test_gap_ratios_of_a_hand_made_line() -> None:
    np.testing.assert_allclose(gap_ratios(np.array([0.0, 1.0, 3.0, 4.0])), [0.5, 0.5])
    np.testing.assert_allclose(gap_ratios(np.array([0.0, 1.0, 3.0, 4.0, 7.0]), 2), [0.75])


def test_line_spacings_follow_a_density_gradient() -> None:
    positions = np.exp(np.linspace(0.0, 2.0, 400))
    np.testing.assert_allclose(line_spacings(positions)[20:-20], 1.0, atol=0.01)


def test_form_factor_limits() -> None:
    generator = np.random.default_rng(7)
    spectra = [independent_levels(100, generator) for _ in range(300)]
    assert dissipative_form_factor(spectra, 0.0)[0] == pytest.approx(100.0)
    late = dissipative_form_factor(spectra, [50.0, 60.0, 70.0], angle=0.3)
    np.testing.assert_allclose(late, 1.0, atol=0.25)


def test_form_factor_shows_repulsion() -> None:
    # Where independent levels have reached the plateau 1, repelling ones are still below it.
    generator = np.random.default_rng(8)
    chaotic = [sample_levels("A", 100, generator) for _ in range(60)]
    times = np.linspace(10.0, 13.0, 7)
    assert np.mean(dissipative_form_factor(chaotic, times)) < 0.6


def test_form_factor_needs_levels() -> None:
    with pytest.raises(UsageError, match="at least one level"):
        dissipative_form_factor([], [1.0])
