"""How every figure looks: journal widths, fonts, colours, and labels with units.

Figures are built with :class:`matplotlib.figure.Figure` alone, so that nothing leaks into the
global state of an interactive session; the settings hold only inside :func:`journal_style`.
"""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from typing import Any, Final

import matplotlib as mpl
import numpy as np
import numpy.typing as npt
from cycler import cycler
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from lbwork.errors import UsageError

__all__ = [
    "COLOUR_MAP",
    "DOUBLE_COLUMN_MM",
    "GREY",
    "MARKERS",
    "PALETTE",
    "SINGLE_COLUMN_MM",
    "column_width",
    "figure_of_size",
    "finite_array",
    "journal_style",
    "letter_panels",
    "plain",
    "with_unit",
]

SINGLE_COLUMN_MM: Final = 86.0
"""Width of one text column of a two-column physics journal."""

DOUBLE_COLUMN_MM: Final = 178.0
"""Width of a full page of a two-column physics journal."""

PALETTE: Final = (
    "#0072B2",
    "#D55E00",
    "#009E73",
    "#CC79A7",
    "#56B4E9",
    "#E69F00",
    "#000000",
)
"""Colour-blind-safe colours of M. Okabe and K. Ito, Color Universal Design (2008), values from
memory; their yellow is left out, since thin lines of it vanish on white paper."""

MARKERS: Final = ("o", "s", "^", "D", "v", "P", "X")
"""One shape per colour, so that sectors stay apart in a black-and-white print."""

GREY: Final = "#777777"
"""Guides: zero lines, frames of zoomed windows, remarks."""

COLOUR_MAP: Final = "viridis"
"""Perceptually uniform, monotonic in lightness (S. van der Walt, N. Smith, 2015)."""

_INCH_MM = 25.4

_SETTINGS: Final[dict[str, Any]] = {
    # Both families are shipped with matplotlib: equal figures on every machine.
    "font.family": ["STIXGeneral", "DejaVu Sans"],
    "mathtext.fontset": "stix",
    "font.size": 8.0,
    "axes.titlesize": 8.0,
    "axes.labelsize": 8.0,
    "figure.titlesize": 8.0,
    "xtick.labelsize": 7.0,
    "ytick.labelsize": 7.0,
    "legend.fontsize": 7.0,
    "axes.linewidth": 0.6,
    "lines.linewidth": 1.0,
    "lines.markersize": 3.5,
    "patch.linewidth": 0.6,
    "grid.linewidth": 0.4,
    "hatch.linewidth": 0.4,
    "xtick.direction": "in",
    "ytick.direction": "in",
    "xtick.top": True,
    "ytick.right": True,
    "xtick.major.width": 0.6,
    "ytick.major.width": 0.6,
    "xtick.minor.width": 0.4,
    "ytick.minor.width": 0.4,
    "xtick.major.size": 3.0,
    "ytick.major.size": 3.0,
    "xtick.minor.size": 1.5,
    "ytick.minor.size": 1.5,
    "axes.formatter.useoffset": False,
    "axes.formatter.use_mathtext": True,
    "axes.formatter.limits": (-3, 4),
    "axes.prop_cycle": cycler(color=PALETTE),
    "legend.frameon": False,
    "legend.handlelength": 1.6,
    "legend.handletextpad": 0.5,
    "legend.borderaxespad": 0.4,
    "legend.labelspacing": 0.3,
    "legend.columnspacing": 1.2,
    "figure.constrained_layout.h_pad": 0.03,
    "figure.constrained_layout.w_pad": 0.03,
    "image.cmap": COLOUR_MAP,
    "figure.dpi": 100.0,
    "savefig.dpi": 400.0,
    "savefig.facecolor": "white",
    "savefig.bbox": None,
    # Type 42 keeps text as text in a PDF (journals refuse Type 3); paths make an SVG look the same
    # where the fonts are not installed.
    "pdf.fonttype": 42,
    "svg.fonttype": "path",
    "svg.hashsalt": "lbwork",
}


@contextmanager
def journal_style() -> Iterator[None]:
    """Settings under which figures are built and saved; the caller's own come back afterwards.

    A user's matplotlibrc does not show through: everything starts from the built-in defaults.
    """
    backend = {"backend", "backend_fallback", "interactive"}
    settings: dict[Any, Any] = {
        key: value for key, value in mpl.rcParamsDefault.items() if key not in backend
    }
    settings.update(_SETTINGS)
    with mpl.rc_context(settings):
        yield


def column_width(width: str) -> float:
    """Width in inches of "single" (86 mm) or "double" (178 mm); UsageError for other words."""
    widths = {"single": SINGLE_COLUMN_MM, "double": DOUBLE_COLUMN_MM}
    if width not in widths:
        raise UsageError(f"unknown figure width '{width}'; use single (86 mm) or double (178 mm)")
    return widths[width] / _INCH_MM


def figure_of_size(width: float, height: float) -> Figure:
    """An empty figure of `width` x `height` inches whose panels are laid out without overlap."""
    return Figure(figsize=(width, height), layout="constrained")


def with_unit(symbol: str, unit: str) -> str:
    """Axis label "symbol / unit" in mathtext; the bare symbol if the unit is empty.

    The unit is that of all rates and energies, the coupling, written J unless the caller knows
    better.
    """
    return rf"${symbol}\;/\;{unit}$" if unit else f"${symbol}$"


def plain(text: str) -> str:
    """Text that is shown letter by letter: a dollar sign does not start a formula."""
    return text.replace("$", r"\$")


def finite_array(values: npt.ArrayLike, name: str, dtype: type = np.float64) -> npt.NDArray[Any]:
    """Flat array of finite numbers, `dtype` (n,).

    Raises UsageError, naming `name`, when there is nothing to draw, the array is not flat or a
    value is not finite.
    """
    array = np.asarray(values)
    if dtype is np.float64 and np.iscomplexobj(array):
        raise UsageError(f"{name} must be real numbers; take the real part first")
    try:
        array = array.astype(dtype)
    except (TypeError, ValueError) as error:
        raise UsageError(f"{name} are not numbers: {error}") from error
    if array.ndim != 1:
        raise UsageError(f"{name} have shape {array.shape}; give a flat array")
    if array.size == 0:
        raise UsageError(f"no {name} to draw; the array is empty")
    if not np.all(np.isfinite(array)):
        place = int(np.flatnonzero(~np.isfinite(array))[0]) + 1
        raise UsageError(f"{name}: entry {place} is {array[place - 1]}; drop what is not finite")
    return array


def letter_panels(panels: tuple[Axes, ...]) -> None:
    """Write (a), (b), ... at the upper left of each panel."""
    for letter, axes in zip("abcdefgh", panels, strict=False):
        axes.set_title(f"({letter})", loc="left", pad=3.0)
