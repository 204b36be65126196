"""The gap against the length of the chain, and the dimensions of the sectors."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt
from matplotlib.figure import Figure
from matplotlib.ticker import FixedLocator, MaxNLocator, NullFormatter

from lbwork.errors import UsageError
from lbwork.report.style import (
    PALETTE,
    column_width,
    figure_of_size,
    finite_array,
    journal_style,
    plain,
    with_unit,
)
from lbwork.report.wording import with_uncertainty

__all__ = ["gap_figure", "sector_figure"]

_MARK_DISTANCE = 0.055
_NAMED_SECTORS = 12


def gap_figure(
    sizes: npt.ArrayLike,
    gaps: npt.ArrayLike,
    *,
    exponent: float | None = None,
    exponent_error: float = 0.0,
    prefactor: float | None = None,
    title: str = "",
    unit: str = "J",
    width: str = "single",
) -> Figure:
    """Liouvillian gap against chain length, both logarithmic, with the fitted power law.

    sizes, gaps: float64 (n,), positive. exponent: z of gap = a L^-z, with its standard error; None
    draws no line. prefactor: a; the one that fits all points best, if None.
    Raises UsageError for empty arrays, unequal lengths and values that are not positive.
    """
    lengths = finite_array(sizes, "sizes")
    values = finite_array(gaps, "gaps")
    if lengths.size != values.size:
        raise UsageError(f"{lengths.size} sizes for {values.size} gaps; give one gap per size")
    for name, array in (("size", lengths), ("gap", values)):
        if np.min(array) <= 0:
            raise UsageError(f"{name} {np.min(array):g} has no logarithm; drop it")
    with journal_style():
        figure = figure_of_size(column_width(width), 2.4 + 0.17 * bool(title))
        axes = figure.subplots()
        axes.set_xscale("log")
        axes.set_yscale("log")
        if exponent is not None:
            if prefactor is None:
                prefactor = float(np.exp(np.mean(np.log(values) + exponent * np.log(lengths))))
            ends = np.array([np.min(lengths) / 1.08, np.max(lengths) * 1.08])
            power = with_uncertainty(exponent, exponent_error)
            axes.plot(
                ends,
                prefactor * ends**-exponent,
                color=PALETTE[1],
                lw=0.8,
                ls=(0, (4, 2)),
                label=rf"$\Delta \propto L^{{-z}},\ z = {power}$",
            )
            axes.legend(loc="upper right")
        axes.plot(lengths, values, "o", color=PALETTE[0])
        shown = np.unique(lengths)
        marks = _thinned(shown)
        axes.set_xticks(marks, [f"{size:g}" for size in marks])
        axes.xaxis.set_minor_locator(FixedLocator(shown.tolist()))
        axes.xaxis.set_minor_formatter(NullFormatter())
        if np.max(values) < 10 * np.min(values):
            _plain_decade(figure)
        if shown.size == 1:
            axes.set_xlim(shown[0] / 2, shown[0] * 2)
        axes.set_xlabel(r"$L$")
        axes.set_ylabel(with_unit(r"\Delta", unit))
        if title:
            axes.set_title(plain(title))
    return figure


def _thinned(sizes: npt.NDArray[np.float64]) -> list[float]:
    """Those of the sorted sizes whose numbers fit beside each other on a logarithmic axis."""
    distance = _MARK_DISTANCE * np.log(sizes[-1] / sizes[0])
    marks = [float(sizes[0])]
    for size in sizes[1:]:
        if np.log(size / marks[-1]) >= distance:
            marks.append(float(size))
    return marks


def _plain_decade(figure: Figure) -> None:
    """Within one decade, a few round numbers say more than a lone power of ten."""
    (axes,) = figure.axes
    low, high = axes.get_ylim()
    decades = 10.0 ** np.arange(np.floor(np.log10(low)), np.ceil(np.log10(high)) + 1)
    marks = np.outer(decades, [1.0, 2.0, 3.0, 5.0]).ravel()
    marks = marks[(marks >= low) & (marks <= high)]
    axes.set_yticks(marks, [f"{mark:g}" for mark in marks])
    axes.yaxis.set_minor_formatter(NullFormatter())


def sector_figure(
    sectors: Sequence[tuple[str, int, int]],
    *,
    title: str = "",
    width: str = "single",
) -> Figure:
    """Dimensions of the sectors, largest first, with the copies each of them stands for.

    sectors: (label, dimension, multiplicity) each. Up to twelve are named; more are drawn as one
    falling line. Raises UsageError when there is none or a dimension is not positive.
    """
    if not sectors:
        raise UsageError("no sectors to draw; the list is empty")
    for label, dimension, _ in sectors:
        if dimension < 1:
            raise UsageError(f"sector '{label}' has dimension {dimension}; at least 1 is needed")
    ordered = sorted(sectors, key=lambda sector: -sector[1])
    dimensions = np.array([dimension for _, dimension, _ in ordered])
    with journal_style():
        named = len(ordered) <= _NAMED_SECTORS
        height = (0.17 * len(ordered) + 0.55 if named else 2.1) + 0.17 * bool(title)
        figure = figure_of_size(column_width(width), height)
        axes = figure.subplots()
        if named:
            places = np.arange(len(ordered))
            axes.barh(places, dimensions, height=0.62, color=PALETTE[0])
            axes.set_yticks(places, [plain(label) for label, _, _ in ordered])
            for place, (_, dimension, copies) in enumerate(ordered):
                text = f"{dimension}" + (rf" $\times{copies}$" if copies > 1 else "")
                axes.annotate(
                    text,
                    (dimension, place),
                    (2, 0),
                    textcoords="offset points",
                    va="center",
                    fontsize=7,
                )
            axes.tick_params(axis="y", length=0)
            axes.set_ylim(len(ordered) - 0.5, -0.5)
            axes.set_xlim(0, 1.22 * int(dimensions[0]))
            axes.xaxis.set_major_locator(MaxNLocator(5, integer=True))
            axes.set_xlabel("dimension")
        else:
            axes.stairs(
                dimensions,
                np.arange(len(ordered) + 1) + 0.5,
                baseline=None,
                color=PALETTE[0],
                lw=1.0,
            )
            axes.set_yscale("log")
            axes.set_xlim(0.5, len(ordered) + 0.5)
            axes.xaxis.set_major_locator(MaxNLocator(6, integer=True))
            axes.set_xlabel("sector, by dimension")
            axes.set_ylabel("dimension")
        if title:
            axes.set_title(plain(title))
    return figure
