"""Spectra that are real: one row of sticks per sector under the density of levels."""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt
from matplotlib.figure import Figure

from lbwork.report.spectrum_parts import Parts, draw_gap, mark_gap, padded, sector_name
from lbwork.report.style import GREY, PALETTE, figure_of_size, plain, with_unit

__all__ = ["line_spectrum"]

_HISTOGRAM_LEVELS = 40
_RUGS = len(PALETTE)


def line_spectrum(
    parts: Parts, gap: float | None, title: str, unit: str, width: float
) -> Figure:
    """The figure of :func:`lbwork.report.spectrum_figure` when no eigenvalue leaves the real axis.

    Levels are counted with multiplicity; up to seven sectors have a row each, more share one.
    """
    rows = parts if len(parts) <= _RUGS else [("all sectors", _joined(parts), 1)]
    levels = np.concatenate([part[1].real for part in parts])
    weights = np.concatenate([np.full(part[1].size, float(part[2])) for part in parts])
    dense = levels.size >= _HISTOGRAM_LEVELS
    rug_height = 0.16 * (len(rows) + (gap is not None and not dense)) + 0.1
    figure = figure_of_size(width, rug_height + 0.42 + 1.25 * dense + 0.17 * bool(title))
    if dense:
        top, rug = figure.subplots(2, 1, sharex=True, height_ratios=[1.25, rug_height])
        bins = min(80, max(10, math.ceil(2 * levels.size ** (1 / 3))))
        top.hist(levels, bins=bins, weights=weights, color=PALETTE[0], alpha=0.35)
        top.hist(levels, bins=bins, weights=weights, color=PALETTE[0], histtype="step")
        top.set_ylabel("levels")
        top.locator_params(axis="y", nbins=5)
        top.set_ylim(0.0, (1.25 if gap is not None else 1.08) * top.get_ylim()[1])
    else:
        rug = figure.subplots()
        top = rug
    for place, (_, values, _) in enumerate(rows):
        rug.eventplot(
            values.real, lineoffsets=-place, linelengths=0.7, linewidths=0.5, colors=PALETTE[place]
        )
    rug.set_yticks(
        [-float(place) for place in range(len(rows))],
        [sector_name(label, multiplicity) for label, _, multiplicity in rows],
    )
    rug.tick_params(axis="y", length=0)
    head = 0.6 if dense or gap is None else 1.6
    rug.set_ylim(-len(rows) + 0.4, head)
    low, high = float(np.min(levels)), max(0.0, float(np.max(levels)))
    rug.set_xlim(*padded(min(low, -(gap or 0.0)), high))
    for axes in {top, rug}:
        axes.axvline(0.0, color=GREY, lw=0.4, zorder=0)
        if gap is not None:
            draw_gap(axes, gap)
    if gap is not None:
        mark_gap(top, gap)
    if title:
        top.set_title(plain(title))
    rug.set_xlabel(with_unit(r"\lambda", unit))
    return figure


def _joined(parts: Parts) -> npt.NDArray[np.complex128]:
    return np.concatenate([part[1] for part in parts])
