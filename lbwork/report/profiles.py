"""Steady states: magnetisation site by site, and the current on the bonds between the sites."""

from __future__ import annotations

import textwrap
from typing import Any

import numpy as np
import numpy.typing as npt
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.ticker import MaxNLocator

from lbwork.errors import UsageError
from lbwork.report.style import (
    GREY,
    PALETTE,
    column_width,
    figure_of_size,
    finite_array,
    journal_style,
    letter_panels,
    plain,
    with_unit,
)

__all__ = ["profile_figure"]

_FLAT = 1e-12
_NAMED_SITES = 12


def profile_figure(
    magnetisation: npt.ArrayLike,
    spin_current: npt.ArrayLike | None,
    *,
    reason: str = "",
    local_dimension: int = 2,
    title: str = "",
    unit: str = "J",
    width: str = "single",
) -> Figure:
    """Magnetisation against site 1..L and, under it, the current on the bonds.

    magnetisation: float64 (L,). spin_current: float64 (L - 1,) on an open chain, (L,) on a ring,
    where bond L joins sites L and 1; the current of bond j stands at j + 1/2, positive to the
    right. None when it is not conserved, and then `reason` is written under the profile.
    local_dimension: 2 labels the axis with sigma^z, more with 2 S^z.
    Raises UsageError for empty or non-finite values and for a wrong number of bonds.
    """
    profile = finite_array(magnetisation, "magnetisations")
    sites = profile.size
    current = None if spin_current is None else finite_array(spin_current, "spin currents")
    if current is not None and current.size not in (sites - 1, sites):
        raise UsageError(
            f"{current.size} spin currents for {sites} sites; an open chain has {sites - 1} bonds, "
            f"a ring {sites}"
        )
    remark = textwrap.wrap(reason, 56 if width == "single" else 130) if current is None else []
    with journal_style():
        height = (1.75 if current is None else 2.75) + 0.17 * bool(title) + 0.14 * len(remark)
        figure = figure_of_size(column_width(width), height)
        symbol = r"\sigma^z_j" if local_dimension == 2 else r"2S^z_j"
        if current is None:
            top = bottom = figure.subplots()
        else:
            top, bottom = figure.subplots(2, 1, sharex=True, height_ratios=[1.35, 1.0])
            bonds = np.arange(1.0, current.size + 1.0) + 0.5
            _series(bottom, bonds, current, 1)
            bottom.set_ylabel(with_unit(r"\mathrm{spin\ current}", unit))
            letter_panels((top, bottom))
        _series(top, np.arange(1, sites + 1), profile, 0)
        top.set_ylabel(rf"$\langle {symbol}\rangle$")
        ring = current is not None and current.size == sites
        bottom.set_xlim(0.5, sites + (1.0 if ring else 0.5))
        if sites <= _NAMED_SITES:
            bottom.set_xticks(np.arange(1, sites + 1))
        else:
            bottom.xaxis.set_major_locator(MaxNLocator(8, integer=True))
        label = r"site $j$" + "".join(f"\n{plain(line)}" for line in remark)
        bottom.set_xlabel(label)
        figure.align_ylabels()
        if title:
            top.set_title(plain(title))
    return figure


def _series(
    axes: Axes, places: npt.NDArray[Any], values: npt.NDArray[np.float64], colour: int
) -> None:
    axes.axhline(0.0, color=GREY, lw=0.5, zorder=0)
    crowded = values.size > 60
    axes.plot(
        places,
        values,
        "-" if crowded else "o-" if colour == 0 else "s-",
        color=PALETTE[colour],
        lw=0.9 if crowded else 0.6,
        clip_on=False,
    )
    # Zero is always in sight, so that a flat current looks flat and not like its rounding noise.
    low, high = min(0.0, float(np.min(values))), max(0.0, float(np.max(values)))
    if high - low < _FLAT:
        low, high = -1.0, 1.0
    margin = 0.12 * (high - low)
    axes.set_ylim(low - margin, high + margin)
    axes.yaxis.set_major_locator(MaxNLocator(5))
