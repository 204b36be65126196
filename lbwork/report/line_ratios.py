"""Gap ratios of levels on a line, and the plane of the two means of levels in the plane."""

from __future__ import annotations

import textwrap
from collections.abc import Mapping
from typing import Final

import numpy as np
import numpy.typing as npt
from matplotlib.figure import Figure

from lbwork.errors import UsageError
from lbwork.report.ratios import IntervalValues, reference_curves
from lbwork.report.style import (
    MARKERS,
    PALETTE,
    column_width,
    figure_of_size,
    finite_array,
    journal_style,
    plain,
)
from lbwork.report.wording import interval_text, reference_label

__all__ = ["gap_ratio_density", "gap_ratio_figure", "means_figure"]

_DYSON_INDEX: Final = {"1d-GOE": 1, "1d-GUE": 2, "1d-GSE": 4}
_NORM: Final = {
    1: 8 / 27,
    2: 4 * np.pi / (81 * np.sqrt(3)),
    4: 4 * np.pi / (729 * np.sqrt(3)),
}
LINE_REFERENCES: Final = ("1d-poisson", "1d-GOE", "1d-GUE", "1d-GSE")


def gap_ratio_density(name: str, ratio: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
    """Density of min(r, 1/r) on 0..1 for "1d-poisson", "1d-GOE", "1d-GUE" or "1d-GSE".

    2 / (1 + r)^2 for independent levels, and the surmise 2 (r + r^2)^b / (Z_b (1 + r + r^2)^(1 +
    3b/2)) with Dyson index b, exact for three levels and within a few per cent for many.
    Raises UsageError for other names.
    Source: Y. Y. Atas, E. Bogomolny, O. Giraud, G. Roux, Phys. Rev. Lett. 110, 084101 (2013).
    """
    if name == "1d-poisson":
        return 2.0 / (1.0 + ratio) ** 2
    if name not in _DYSON_INDEX:
        known = ", ".join(LINE_REFERENCES)
        raise UsageError(f"no gap-ratio density for '{name}'; known are {known}")
    index = _DYSON_INDEX[name]
    weight = 2.0 * (ratio + ratio**2) ** index / _NORM[index]
    return weight / (1.0 + ratio + ratio**2) ** (1.0 + 1.5 * index)


def gap_ratio_figure(
    ratios: npt.ArrayLike,
    *,
    verdict: str = "",
    mean_ratio: IntervalValues | None = None,
    width: str = "single",
) -> Figure:
    """Histogram of consecutive-gap ratios min(r, 1/r), float64 (n,), with the four references.

    Error bars are one standard deviation of the count. Raises UsageError when there are no ratios
    or one is outside 0..1.
    """
    values = finite_array(ratios, "gap ratios")
    if np.min(values) < 0 or np.max(values) > 1:
        raise UsageError(
            f"gap ratios reach from {np.min(values):.4g} to {np.max(values):.4g}; "
            "min(r, 1/r) lies in 0..1"
        )
    size = column_width(width)
    lines = textwrap.wrap(verdict, 60 if width == "single" else 130)
    with journal_style():
        figure = figure_of_size(size, 2.2 + 0.15 * len(lines) + 0.15 * (mean_ratio is not None))
        axes = figure.subplots()
        grid = np.linspace(0.0, 1.0, 201)
        for name, look in reference_curves(dict.fromkeys(LINE_REFERENCES)):
            axes.plot(grid, gap_ratio_density(name, grid), label=reference_label(name), **look)
        bins = int(np.clip(round(np.sqrt(values.size) / 2), 5, 25))
        counts, edges = np.histogram(values, bins, (0.0, 1.0))
        scale = bins / values.size
        axes.stairs(counts * scale, edges, fill=True, color="#dddddd", zorder=0, label="data")
        axes.errorbar(
            0.5 * (edges[1:] + edges[:-1]),
            counts * scale,
            yerr=np.sqrt(counts) * scale,
            fmt="none",
            color="black",
            lw=0.6,
        )
        axes.set_xlim(0.0, 1.0)
        # Curves start below two and the legend wants a strip above them.
        axes.set_ylim(0.0, 1.32 * max(2.0, float(np.max(counts * scale))))
        axes.set_xlabel(r"$\tilde r = \min(r, 1/r)$")
        axes.set_ylabel(r"$p(\tilde r)$")
        axes.legend(loc="upper center", ncols=5, handlelength=1.4, columnspacing=0.9)
        titles = [plain(line) for line in lines]
        if mean_ratio is not None:
            titles.append(rf"$\langle\tilde r\rangle =$ {interval_text(*mean_ratio)}")
        if titles:
            axes.set_title("\n".join(titles))
    return figure


def means_figure(
    measured: Mapping[str, tuple[IntervalValues, IntervalValues]],
    references: Mapping[str, tuple[float, float]],
    *,
    title: str = "",
    width: str = "single",
) -> Figure:
    """Mean modulus against minus the mean cosine of complex spacing ratios, with the references.

    measured: per label ((value, low, high) of r, (value, low, high) of cos theta). references: per
    name (mean r, mean cos theta). Raises UsageError when nothing was measured.
    """
    if not measured:
        raise UsageError("no measured means to draw; the mapping is empty")
    with journal_style():
        figure = figure_of_size(column_width(width), 2.5 + 0.15 * bool(title))
        axes = figure.subplots()
        for name, (ratio, cosine) in references.items():
            axes.plot(-cosine, ratio, "+", color="black", ms=6, mew=0.8)
            axes.annotate(
                reference_label(name), (-cosine, ratio), (4, -8), textcoords="offset points"
            )
        for place, (label, (ratios, cosines)) in enumerate(measured.items()):
            colour = PALETTE[place % len(PALETTE)]
            axes.errorbar(
                -cosines[0],
                ratios[0],
                xerr=[[cosines[2] - cosines[0]], [cosines[0] - cosines[1]]],
                yerr=[[ratios[0] - ratios[1]], [ratios[2] - ratios[0]]],
                fmt=MARKERS[place % len(MARKERS)],
                color=colour,
                lw=0.8,
                capsize=1.5,
                label=plain(label),
            )
        axes.margins(0.14)
        axes.set_xlabel(r"$-\langle\cos\theta\rangle$")
        axes.set_ylabel(r"$\langle r\rangle$")
        axes.legend(loc="upper left")
        if title:
            axes.set_title(plain(title))
    return figure
