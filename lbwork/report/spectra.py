"""Spectra of generators: points in the complex plane, or sticks and a density if all are real."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import numpy as np
import numpy.typing as npt
from matplotlib.axes import Axes
from matplotlib.collections import PathCollection
from matplotlib.colors import LogNorm
from matplotlib.figure import Figure
from matplotlib.patches import Rectangle

from lbwork.errors import UsageError
from lbwork.report.line_spectra import line_spectrum
from lbwork.report.spectrum_parts import Parts, draw_gap, mark_gap, padded, sector_name
from lbwork.report.style import (
    COLOUR_MAP,
    GREY,
    MARKERS,
    PALETTE,
    column_width,
    figure_of_size,
    finite_array,
    journal_style,
    letter_panels,
    plain,
    with_unit,
)

__all__ = ["SectorLevels", "Window", "spectrum_figure"]

SectorLevels = tuple[str, npt.ArrayLike, int]
"""(label, eigenvalues complex (n,), multiplicity)."""

Window = tuple[float, float, float, float]
"""Part of the complex plane: least and greatest real part, least and greatest imaginary part."""

_REAL_TOLERANCE = 1e-10
_ASPECTS = (0.4, 1.1)
_SHAPED_POINTS = 600
_VECTOR_POINTS = 20_000


def spectrum_figure(
    sectors: Sequence[SectorLevels],
    *,
    gap: float | None = None,
    zoom: Window | None = None,
    title: str = "",
    unit: str = "J",
    width: str = "single",
) -> Figure:
    """Eigenvalues of a generator, coloured by sector.

    sectors: (label, eigenvalues complex (n,), multiplicity) each; up to seven are told apart by
    colour and named, more are coloured by their dimension n. A real spectrum is drawn as one row of
    sticks per sector under the density of levels, counted with multiplicity. gap: drawn as a thin
    line at Re lambda = -gap. zoom: window shown enlarged in a second panel, for instance the
    neighbourhood of the real axis. unit: symbol of the coupling. Axes of the plane are equal.
    Raises UsageError when there is no eigenvalue, one is not finite, the gap is negative or the
    window is empty.
    """
    parts = _checked(sectors)
    if gap is not None and not (math.isfinite(gap) and gap >= 0):
        raise UsageError(f"gap {gap} is not a finite number >= 0")
    everything = np.concatenate([levels for _, levels, _ in parts])
    radius = float(np.max(np.abs(everything)))
    with journal_style():
        if everything.size > 1 and np.max(np.abs(everything.imag)) <= _REAL_TOLERANCE * radius:
            return line_spectrum(parts, gap, title, unit, column_width(width))
        return _in_the_plane(parts, everything, gap, zoom, title, unit, column_width(width))


def _checked(sectors: Sequence[SectorLevels]) -> Parts:
    if not sectors:
        raise UsageError("no sectors to draw; the list is empty")
    parts = []
    for label, eigenvalues, multiplicity in sectors:
        levels = finite_array(eigenvalues, f"eigenvalues of sector '{label}'", np.complex128)
        if multiplicity < 1:
            raise UsageError(f"sector '{label}' has multiplicity {multiplicity}; at least 1 counts")
        parts.append((label, levels, int(multiplicity)))
    return parts


def _plane_limits(levels: npt.NDArray[np.complex128], gap: float | None) -> Window:
    right = max(0.0, float(np.max(levels.real)))
    left = min(float(np.min(levels.real)), -(gap or 0.0))
    x_low, x_high = padded(left, right)
    bottom, top = float(np.min(levels.imag)), float(np.max(levels.imag))
    y_low, y_high = padded(min(0.0, bottom), max(0.0, top))
    if gap is not None:
        # Head room, so that the number of the gap hides no eigenvalue.
        y_high += 0.08 * (y_high - y_low)
    shallow, steep = _ASPECTS
    lacking = shallow * (x_high - x_low) - (y_high - y_low)
    if lacking > 0:
        y_low, y_high = y_low - lacking / 2, y_high + lacking / 2
    lacking = (y_high - y_low) / steep - (x_high - x_low)
    if lacking > 0:
        x_low, x_high = x_low - lacking / 2, x_high + lacking / 2
    return x_low, x_high, y_low, y_high


def _in_the_plane(
    parts: Parts,
    everything: npt.NDArray[np.complex128],
    gap: float | None,
    zoom: Window | None,
    title: str,
    unit: str,
    width: float,
) -> Figure:
    windows = [_plane_limits(everything, gap)]
    if zoom is not None:
        x_low, x_high, y_low, y_high = zoom
        if not (x_low < x_high and y_low < y_high):
            raise UsageError(f"zoom window {zoom} is empty; give (left, right, bottom, top)")
        windows.append(zoom)
    named = len(parts) <= len(PALETTE)
    columns, rows = _legend_shape(parts, width)
    inner = width - 0.5 - (0.0 if named else 0.45)
    shapes = [(top - bottom) / (right - left) for left, right, bottom, top in windows]
    height = sum(inner * min(shape, 1.4) + 0.4 for shape in shapes)
    height += 0.17 * bool(title) + 0.15 * len(windows[1:]) + (0.14 * rows + 0.05) * named
    figure = figure_of_size(width, height)
    panels = tuple(
        np.atleast_1d(figure.subplots(len(windows), 1, height_ratios=shapes)).tolist()
    )
    mappable: Any = None
    for axes, window in zip(panels, windows, strict=True):
        mappable = _draw_points(axes, parts, _within(everything, window), named)
        _frame(axes, window, gap, unit)
    if gap is not None:
        mark_gap(panels[0], gap)
    if len(panels) > 1:
        left, right, bottom, top = windows[1]
        panels[0].add_patch(
            Rectangle((left, bottom), right - left, top - bottom, fill=False, color=GREY, lw=0.6)
        )
        letter_panels(panels)
    if title:
        panels[0].set_title(plain(title))
    if named and len(parts) > 1:
        handles, labels = panels[0].get_legend_handles_labels()
        legend = figure.legend(handles, labels, loc="outside lower center", ncols=columns)
        for handle in legend.legend_handles:
            if isinstance(handle, PathCollection):
                handle.set_sizes([14.0])
    elif not named and mappable is not None:
        _dimension_bar(figure, mappable, panels)
    return figure


def _within(levels: npt.NDArray[np.complex128], window: Window) -> int:
    left, right, bottom, top = window
    x, y = levels.real, levels.imag
    return int(np.count_nonzero((x >= left) & (x <= right) & (y >= bottom) & (y <= top)))


def _dimension_bar(figure: Figure, mappable: Any, panels: tuple[Axes, ...]) -> None:
    low, high = mappable.get_clim()
    marks = np.outer(10.0 ** np.arange(0, np.ceil(np.log10(high)) + 1), [1.0, 2.0, 5.0]).ravel()
    marks = marks[(marks >= low) & (marks <= high)]
    bar = figure.colorbar(mappable, ax=list(panels), aspect=30, pad=0.02)
    if marks.size >= 2:
        bar.set_ticks(marks.tolist(), labels=[f"{mark:g}" for mark in marks])
    else:
        bar.set_ticks([low, high], labels=[f"{low:g}", f"{high:g}"])
    bar.minorticks_off()
    bar.set_label("sector dimension")
    bar.outline.set_linewidth(0.6)


def _draw_points(axes: Axes, parts: Parts, count: int, named: bool) -> Any:
    """Points of all sectors in one panel; returns what a colour bar needs, else None."""
    shaped = sum(levels.size for _, levels, _ in parts) <= _SHAPED_POINTS
    area = float(np.clip(6000.0 / max(count, 1), 1.6, 14.0))
    common: dict[str, Any] = {
        "s": area,
        "linewidths": 0.0,
        "alpha": 0.85,
        "rasterized": count > _VECTOR_POINTS,
        "zorder": 2,
    }
    if named:
        for place, (label, levels, multiplicity) in enumerate(parts):
            axes.scatter(
                levels.real,
                levels.imag,
                color=PALETTE[place],
                marker=MARKERS[place] if shaped else "o",
                label=sector_name(label, multiplicity),
                **common,
            )
        return None
    # Small sectors last, or the large ones would bury them.
    ordered = sorted(parts, key=lambda part: -part[1].size)
    levels = np.concatenate([part[1] for part in ordered])
    dimensions = np.repeat([part[1].size for part in ordered], [part[1].size for part in ordered])
    if dimensions[0] == dimensions[-1]:
        axes.scatter(levels.real, levels.imag, color=PALETTE[0], marker="o", **common)
        return None
    return axes.scatter(
        levels.real,
        levels.imag,
        c=dimensions,
        cmap=COLOUR_MAP,
        norm=LogNorm(int(dimensions[-1]), int(dimensions[0])),
        marker="o",
        **common,
    )


def _frame(axes: Axes, window: Window, gap: float | None, unit: str) -> None:
    axes.set_aspect("equal", adjustable="box")
    axes.set_xlim(window[0], window[1])
    axes.set_ylim(window[2], window[3])
    axes.axhline(0.0, color=GREY, lw=0.4, zorder=0)
    axes.axvline(0.0, color=GREY, lw=0.4, zorder=0)
    if gap is not None and window[0] < -gap < window[1]:
        draw_gap(axes, gap)
    axes.locator_params(nbins=6)
    axes.set_xlabel(with_unit(r"\mathrm{Re}\,\lambda", unit))
    axes.set_ylabel(with_unit(r"\mathrm{Im}\,\lambda", unit))


def _legend_shape(parts: Parts, width: float) -> tuple[int, int]:
    """Columns and rows of the legend: about 17 letters of 7 points per inch."""
    if len(parts) == 1:
        return 1, 0
    longest = max(len(label) + (4 if many > 1 else 0) for label, _, many in parts) + 5
    columns = max(1, min(len(parts), 4, int(width * 17 / longest)))
    return columns, math.ceil(len(parts) / columns)
