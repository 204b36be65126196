"""What the spectrum of the plane and the spectrum of a line have in common."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from matplotlib.axes import Axes

from lbwork.report.style import PALETTE, plain

__all__ = ["Parts", "draw_gap", "mark_gap", "padded", "sector_name"]

Parts = list[tuple[str, npt.NDArray[np.complex128], int]]
"""Checked sectors: (label, eigenvalues complex128 (n,), multiplicity)."""


def padded(low: float, high: float) -> tuple[float, float]:
    """Room around the data; a single value gets a scale of its own size."""
    span = high - low
    if span <= 1e-12 * max(abs(low), abs(high)):
        span = 10 * max(abs(low), abs(high), 0.1)
    return low - 0.05 * span, high + 0.05 * span


def draw_gap(axes: Axes, gap: float) -> None:
    """A thin line at Re lambda = -gap, behind the points."""
    axes.axvline(-gap, color=PALETTE[1], lw=0.7, ls=(0, (4, 2)), zorder=1)


def mark_gap(axes: Axes, gap: float) -> None:
    """The value of the gap at the top of its line, on the side with more room."""
    left, right = axes.get_xlim()
    toward_left = (-gap - left) > 0.4 * (right - left)
    axes.annotate(
        rf"$\Delta = {gap:.4g}$",
        xy=(-gap, 1.0),
        xycoords=("data", "axes fraction"),
        xytext=(-3 if toward_left else 3, -3),
        textcoords="offset points",
        ha="right" if toward_left else "left",
        va="top",
        fontsize=7,
        color=PALETTE[1],
    )


def sector_name(label: str, multiplicity: int) -> str:
    """Label of a sector, with the number of copies it stands for if there are several."""
    return plain(label) + (rf" ($\times{multiplicity}$)" if multiplicity > 1 else "")
