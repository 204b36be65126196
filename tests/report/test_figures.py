"""Figures of plain arrays: what they refuse, what they show, and that nothing warns."""

from __future__ import annotations

import numpy as np
import pytest
from matplotlib.figure import Figure
from matplotlib.text import Text

from lbwork.errors import UsageError
from lbwork.report import (
    gap_figure,
    gap_ratio_density,
    gap_ratio_figure,
    means_figure,
    plane_references,
    profile_figure,
    ratio_figure,
    sector_figure,
    spectrum_figure,
)
from lbwork.report.ratios import disc_histogram, radial_marginal

pytestmark = pytest.mark.filterwarnings("error")


def drawn(figure: Figure) -> Figure:
    figure.draw_without_rendering()
    return figure


def texts(figure: Figure) -> str:
    return " ".join(text.get_text() for text in figure.findobj() if hasattr(text, "get_text"))


def disc(count: int, seed: int) -> np.ndarray:
    generator = np.random.default_rng(seed)
    radius = np.sqrt(generator.uniform(size=count))
    return radius * np.exp(2j * np.pi * generator.uniform(size=count))


def test_axes_of_the_complex_plane_are_equal() -> None:
    figure = drawn(spectrum_figure([("a", disc(200, 1) - 1, 1), ("b", disc(50, 2) - 1, 4)]))
    (axes,) = figure.axes
    assert axes.get_aspect() == 1.0
    box = axes.get_window_extent()
    left, right = axes.get_xlim()
    bottom, top = axes.get_ylim()
    assert box.width / (right - left) == pytest.approx(box.height / (top - bottom), rel=1e-6)
    assert r"\mathrm{Re}\,\lambda" in axes.get_xlabel()
    assert r"\mathrm{Im}\,\lambda" in axes.get_ylabel()


@pytest.mark.parametrize("shift", [0.02, 1.0, 50.0])
def test_all_eigenvalues_are_in_sight(shift: float) -> None:
    levels = shift * disc(100, 3).real - shift + 1j * disc(100, 4).imag
    (axes,) = spectrum_figure([("all", levels, 1)], gap=0.1).axes
    left, right = axes.get_xlim()
    bottom, top = axes.get_ylim()
    assert left < levels.real.min() and levels.real.max() < right and left < -0.1 < right
    assert bottom < levels.imag.min() and levels.imag.max() < top


def test_gap_is_marked_and_written() -> None:
    figure = drawn(spectrum_figure([("all", disc(40, 5) - 1, 1)], gap=0.25))
    lines = [line.get_xdata()[0] for line in figure.axes[0].lines]
    assert -0.25 in lines
    assert "0.25" in texts(figure)


def test_few_sectors_are_named_with_their_copies() -> None:
    figure = drawn(spectrum_figure([("k=0", disc(9, 6), 1), ("k=1", disc(9, 7), 4)]))
    assert [text.get_text() for text in figure.legends[0].get_texts()] == [
        "k=0",
        r"k=1 ($\times4$)",
    ]


def test_many_sectors_are_coloured_by_dimension() -> None:
    sectors = [(f"s{size}", disc(size, size), 1) for size in range(10, 130, 3)]
    figure = drawn(spectrum_figure(sectors))
    assert not figure.legends
    assert figure.axes[1].get_ylabel() == "sector dimension"


def test_many_sectors_of_one_dimension_need_no_colour_bar() -> None:
    figure = drawn(spectrum_figure([(f"s{place}", disc(7, place), 1) for place in range(9)]))
    assert len(figure.axes) == 1


def test_zoomed_window_has_a_panel_of_its_own() -> None:
    figure = drawn(
        spectrum_figure([("all", disc(500, 8) - 1, 1)], gap=0.1, zoom=(-0.5, 0.1, -0.2, 0.2))
    )
    assert figure.axes[1].get_xlim() == (-0.5, 0.1)
    assert figure.axes[1].get_aspect() == 1.0


@pytest.mark.parametrize("levels", [[0.0], [-1 + 2j], [0.0, 0.0], np.zeros(50), [-1e-9, -1e-9]])
def test_degenerate_spectra_are_drawn(levels: list[complex]) -> None:
    figure = drawn(spectrum_figure([("all", levels, 1)], gap=0.0))
    assert len(figure.axes) >= 1
    assert all(np.isfinite([*axes.get_xlim(), *axes.get_ylim()]).all() for axes in figure.axes)


def test_real_spectra_are_sticks_and_a_density() -> None:
    generator = np.random.default_rng(9)
    levels = -generator.exponential(size=300)
    figure = drawn(spectrum_figure([("a", levels, 2), ("b", levels[:50], 1)], gap=0.01))
    density, rug = figure.axes
    assert density.get_ylabel() == "levels"
    assert [text.get_text() for text in rug.get_yticklabels()] == [r"a ($\times2$)", "b"]
    # The density counts every copy: 2 * 300 + 50 levels.
    assert sum(bar.get_height() for bar in density.containers[0]) == pytest.approx(650)


def test_few_real_levels_are_sticks_alone() -> None:
    assert len(drawn(spectrum_figure([("a", [-1.0, -0.5, 0.0], 1)], gap=0.5)).axes) == 1


def test_dollar_signs_in_labels_are_letters() -> None:
    sectors = [("price $ one", disc(5, 10), 1), ("_$", disc(5, 11), 1)]
    figure = drawn(spectrum_figure(sectors, title="5 $"))
    words = [text.get_text() for text in figure.findobj(Text)]
    assert any("price" in word for word in words)


@pytest.mark.parametrize(
    ("sectors", "words"),
    [
        ([], "no sectors"),
        ([("k=0", [], 1)], "k=0"),
        ([("k=0", [0.0, np.nan], 1)], "entry 2"),
        ([("k=0", [[0.0]], 1)], "shape"),
        ([("k=0", ["x"], 1)], "not numbers"),
        ([("k=0", [0.0], 0)], "multiplicity 0"),
    ],
)
def test_empty_or_broken_spectra_are_refused(sectors: list, words: str) -> None:
    with pytest.raises(UsageError, match=words):
        spectrum_figure(sectors)


def test_negative_gap_and_empty_window_are_refused() -> None:
    with pytest.raises(UsageError, match=r"gap -1\.0"):
        spectrum_figure([("a", [0j, -1 + 1j], 1)], gap=-1.0)
    with pytest.raises(UsageError, match="zoom window"):
        spectrum_figure([("a", [0j, -1 + 1j], 1)], zoom=(0.0, 0.0, -1.0, 1.0))
    with pytest.raises(UsageError, match="'wide'"):
        spectrum_figure([("a", [0j, -1 + 1j], 1)], width="wide")


@pytest.mark.parametrize("count", [1, 30, 3000, 20_000])
@pytest.mark.parametrize("width", ["single", "double"])
def test_ratio_figure_for_any_number_of_ratios(count: int, width: str) -> None:
    figure = drawn(
        ratio_figure(
            disc(count, 12),
            plane_references(),
            "poisson",
            verdict="Independent levels.",
            mean_ratio=(0.667, 0.66, 0.674),
            mean_cosine=(0.0, -0.01, 0.01),
            width=width,
        )
    )
    assert [axes.get_aspect() for axes in figure.axes[:2]] == [1.0, 1.0]
    assert "0.667 [0.660, 0.674]" in texts(figure)


def test_both_discs_share_one_colour_scale() -> None:
    figure = ratio_figure(disc(500, 13), plane_references("A x2"), "A x2")
    data, reference = (axes.collections[0].get_clim() for axes in figure.axes[:2])
    assert data == reference


def test_histogram_in_the_disc_is_normalised() -> None:
    r_edges, theta_edges, density = disc_histogram(disc(999, 14))
    area = np.outer(0.5 * np.diff(r_edges**2), np.diff(theta_edges))
    assert np.sum(density * area) == pytest.approx(1.0)


@pytest.mark.parametrize("name", ["poisson", "A", "AI+", "AII+"])
def test_radial_marginal_of_references(name: str) -> None:
    density = plane_references()[name]
    r_edges = density[0]
    marginal = radial_marginal(density)
    assert np.sum(marginal * np.diff(r_edges)) == pytest.approx(1.0, abs=1e-6)
    if name == "poisson":
        # A flat disc: p(r) = 2 r, exact.
        np.testing.assert_allclose(marginal, r_edges[1:] + r_edges[:-1], rtol=1e-12)


def test_broken_ratios_are_refused() -> None:
    references = plane_references()
    with pytest.raises(UsageError, match="no spacing ratios"):
        ratio_figure([], references, "A")
    with pytest.raises(UsageError, match=r"modulus 1\.5"):
        ratio_figure([1.5j], references, "A")
    with pytest.raises(UsageError, match="'B'"):
        ratio_figure([0.5j], references, "B")


@pytest.mark.parametrize(
    ("name", "mean"),
    [
        # Means of the surmise, Y. Y. Atas et al., Phys. Rev. Lett. 110, 084101 (2013); from memory.
        ("1d-poisson", 2 * np.log(2) - 1),
        ("1d-GOE", 4 - 2 * np.sqrt(3)),
        ("1d-GUE", 2 * np.sqrt(3) / np.pi - 1 / 2),
        ("1d-GSE", 32 * np.sqrt(3) / (15 * np.pi) - 1 / 2),
    ],
)
def test_gap_ratio_densities(name: str, mean: float) -> None:
    nodes, weights = np.polynomial.legendre.leggauss(60)
    ratio = (nodes + 1) / 2
    density = gap_ratio_density(name, ratio)
    assert np.sum(weights * density) / 2 == pytest.approx(1.0, abs=1e-12)
    assert np.sum(weights * density * ratio) / 2 == pytest.approx(mean, abs=1e-12)


def test_gap_ratio_figure() -> None:
    ratios = np.random.default_rng(15).uniform(size=400)
    figure = drawn(gap_ratio_figure(ratios, verdict="Undecided.", mean_ratio=(0.5, 0.47, 0.53)))
    assert "Undecided." in texts(figure)
    drawn(gap_ratio_figure([0.3]))
    with pytest.raises(UsageError, match=r"0\.\.1"):
        gap_ratio_figure([0.3, 1.2])
    with pytest.raises(UsageError, match="no gap ratios"):
        gap_ratio_figure([])
    with pytest.raises(UsageError, match="must be real"):
        gap_ratio_figure([0.3j])
    with pytest.raises(UsageError, match="1d-GXE"):
        gap_ratio_density("1d-GXE", ratios)


def test_means_figure() -> None:
    point = ((0.72, 0.71, 0.73), (-0.19, -0.21, -0.18))
    drawn(means_figure({"L = 6": point}, {"poisson": (2 / 3, 0.0), "AI+": (0.722, -0.193)}))
    with pytest.raises(UsageError, match="no measured means"):
        means_figure({}, {})


def test_current_stands_between_the_sites() -> None:
    figure = drawn(profile_figure([0.5, 0.0, -0.5], [0.25, 0.25]))
    top, bottom = figure.axes
    np.testing.assert_array_equal(top.lines[1].get_xdata(), [1, 2, 3])
    np.testing.assert_array_equal(bottom.lines[1].get_xdata(), [1.5, 2.5])
    low, high = bottom.get_ylim()
    assert low < 0 < 0.25 < high
    ring = drawn(profile_figure([0.5, 0.0, -0.5], [0.25, 0.25, 0.25]))
    assert ring.axes[1].lines[1].get_xdata()[-1] == 3.5


def test_rounding_noise_of_a_vanishing_profile_is_not_blown_up() -> None:
    figure = profile_figure([1e-17, -2e-17, 0.0], [1e-18, 0.0], local_dimension=3)
    assert all(axes.get_ylim()[1] > 1 for axes in figure.axes)
    assert "2S^z" in figure.axes[0].get_ylabel()


def test_profile_without_current_says_why() -> None:
    figure = drawn(profile_figure(np.linspace(1, -1, 80), None, reason="loss breaks the charge"))
    assert len(figure.axes) == 1
    assert "loss breaks the charge" in figure.axes[0].get_xlabel()
    drawn(profile_figure([0.1], None))


def test_broken_profiles_are_refused() -> None:
    with pytest.raises(UsageError, match="no magnetisations"):
        profile_figure([], None)
    with pytest.raises(UsageError, match="4 spin currents for 3 sites"):
        profile_figure([0.0, 0.0, 0.0], [1.0] * 4)
    with pytest.raises(UsageError, match="entry 2 is inf"):
        profile_figure([0.0, np.inf], None)


def test_gap_figure_is_logarithmic_and_draws_the_fit() -> None:
    sizes = np.arange(4, 11)
    figure = drawn(gap_figure(sizes, 3.0 * sizes**-1.5, exponent=1.5, exponent_error=0.03))
    (axes,) = figure.axes
    assert (axes.get_xscale(), axes.get_yscale()) == ("log", "log")
    x, y = axes.lines[0].get_data()
    np.testing.assert_allclose(y, 3.0 * x**-1.5, rtol=1e-12)
    assert "1.50(3)" in texts(figure)
    assert [text.get_text() for text in axes.get_xticklabels()] == [str(size) for size in sizes]


def test_gap_figure_of_one_and_of_many_sizes() -> None:
    drawn(gap_figure([4], [0.5]))
    many = drawn(gap_figure(np.arange(2, 60), 1.0 / np.arange(2, 60) ** 3))
    assert 3 < len(many.axes[0].get_xticklabels()) < 20


def test_broken_gaps_are_refused() -> None:
    with pytest.raises(UsageError, match="no sizes"):
        gap_figure([], [])
    with pytest.raises(UsageError, match="2 sizes for 1 gaps"):
        gap_figure([4, 6], [1.0])
    with pytest.raises(UsageError, match="gap 0 has no logarithm"):
        gap_figure([4, 6], [1.0, 0.0])


def test_sector_figure() -> None:
    few = drawn(sector_figure([("k=0", 20, 1), ("k=1", 50, 2)]))
    assert [text.get_text() for text in few.axes[0].get_yticklabels()] == ["k=1", "k=0"]
    many = drawn(sector_figure([(f"k={place}", place + 1, 1) for place in range(40)]))
    assert many.axes[0].get_yscale() == "log"
    with pytest.raises(UsageError, match="no sectors"):
        sector_figure([])
    with pytest.raises(UsageError, match="dimension 0"):
        sector_figure([("k=0", 0, 1)])
