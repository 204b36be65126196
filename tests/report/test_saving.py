"""Files of figures: formats, equal bytes, nothing left behind, and the caller's settings."""

from __future__ import annotations

from pathlib import Path

import matplotlib as mpl
import numpy as np
import pytest
from matplotlib.figure import Figure

from lbwork.errors import StoreError, UsageError
from lbwork.report import (
    DOUBLE_COLUMN_MM,
    SINGLE_COLUMN_MM,
    plane_references,
    profile_figure,
    ratio_figure,
    save_figure,
    spectrum_figure,
)

pytestmark = pytest.mark.filterwarnings("error")


def example() -> Figure:
    levels = np.exp(2j * np.pi * np.arange(12) / 12) - 1
    return spectrum_figure([("k=0", levels, 1), ("k=1", 0.5 * levels, 2)], gap=0.1, title="ring")


@pytest.mark.parametrize(
    ("name", "start"),
    [("a.pdf", b"%PDF"), ("a.svg", b"<?xml"), ("a.png", b"\x89PNG"), ("a.b.PNG", b"\x89PNG")],
)
def test_formats(tmp_path: Path, name: str, start: bytes) -> None:
    path = save_figure(example(), tmp_path / name)
    content = path.read_bytes()
    assert content.startswith(start)
    assert len(content) > 2000
    assert [entry.name for entry in tmp_path.iterdir()] == [name]


@pytest.mark.parametrize("suffix", ["svg", "pdf", "png"])
def test_equal_figures_give_equal_bytes(tmp_path: Path, suffix: str) -> None:
    first = save_figure(example(), tmp_path / f"first.{suffix}").read_bytes()
    second = save_figure(example(), tmp_path / f"second.{suffix}").read_bytes()
    assert first == second
    assert b"Date" not in first


def test_shaded_discs_are_deterministic_too(tmp_path: Path) -> None:
    ratios = 0.9 * np.exp(1j * np.arange(500.0))
    one, two = (
        save_figure(ratio_figure(ratios, plane_references(), "A"), tmp_path / name).read_bytes()
        for name in ("one.svg", "two.svg")
    )
    assert one == two


@pytest.mark.parametrize("name", ["a.jpg", "a.eps", "a", ".svg"])
def test_unknown_suffix_is_refused(tmp_path: Path, name: str) -> None:
    with pytest.raises(UsageError, match=r"\.pdf, \.svg, \.png"):
        save_figure(example(), tmp_path / name)
    assert not list(tmp_path.iterdir())


def test_missing_folder_and_taken_name_are_refused(tmp_path: Path) -> None:
    with pytest.raises(UsageError, match="does not exist"):
        save_figure(example(), tmp_path / "nowhere" / "a.svg")
    (tmp_path / "a.svg").mkdir()
    with pytest.raises(StoreError, match=r"a\.svg"):
        save_figure(example(), tmp_path / "a.svg")
    assert [entry.name for entry in tmp_path.iterdir()] == ["a.svg"]


@pytest.mark.parametrize(
    ("width", "millimetres"), [("single", SINGLE_COLUMN_MM), ("double", DOUBLE_COLUMN_MM)]
)
def test_figures_have_the_width_of_a_column(width: str, millimetres: float) -> None:
    figure = profile_figure([0.5, -0.5], [1.0], width=width)
    assert figure.get_figwidth() * 25.4 == pytest.approx(millimetres)


def test_nothing_sticks_out_of_the_paper() -> None:
    figure = example()
    figure.draw_without_rendering()
    box = figure.get_tightbbox()
    assert box.x0 >= 0 and box.y0 >= 0
    assert box.x1 <= figure.get_figwidth() and box.y1 <= figure.get_figheight()


def test_settings_of_the_caller_neither_show_nor_change(tmp_path: Path) -> None:
    plain = save_figure(example(), tmp_path / "plain.svg").read_bytes()
    with mpl.rc_context({"font.size": 30, "axes.grid": True, "svg.fonttype": "none"}):
        loud = save_figure(example(), tmp_path / "loud.svg").read_bytes()
        assert mpl.rcParams["font.size"] == 30
    assert loud == plain
