"""Spacing ratios beside their references: the disc of the complex ratio and its two marginals."""

from __future__ import annotations

import textwrap
from collections.abc import Mapping
from typing import Any

import numpy as np
import numpy.typing as npt
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.patches import Circle

from lbwork.errors import UsageError
from lbwork.report.style import (
    COLOUR_MAP,
    PALETTE,
    column_width,
    figure_of_size,
    finite_array,
    journal_style,
    letter_panels,
    plain,
)
from lbwork.report.wording import interval_text, reference_label

__all__ = [
    "Density",
    "IntervalValues",
    "disc_histogram",
    "radial_marginal",
    "ratio_figure",
    "reference_curves",
]

Density = tuple[npt.NDArray[np.float64], npt.NDArray[np.float64], npt.NDArray[np.float64]]
"""(r_edges (m + 1,), theta_edges (k + 1,) of |theta| in 0..pi, pdf (m, k) per unit area)."""

IntervalValues = tuple[float, float, float]
"""A mean and the ends of its interval: (value, low, high)."""

_DASHES: tuple[Any, ...] = ("-", (0, (4, 1.5)), (0, (1, 1.2)), (0, (5, 1.2, 1, 1.2)))
_SCATTERED = 400
_CELL_LEVELS = 35
_MOST_CELLS = (16, 32)


def ratio_figure(
    ratios: npt.ArrayLike,
    references: Mapping[str, Density],
    reference_name: str,
    *,
    verdict: str = "",
    mean_ratio: IntervalValues | None = None,
    mean_cosine: IntervalValues | None = None,
    width: str = "single",
) -> Figure:
    """Complex spacing ratios z = r exp(i theta): density in the unit disc and marginals.

    ratios: complex128 (n,), |z| <= 1. references: densities by name, as
    :func:`lbwork.levels.reference_density` gives them. reference_name: the one drawn in the disc
    beside the data, in the same colour scale; all of them appear as curves of p(r) and p(theta).
    The cells of the data grow as their number shrinks, so that each holds some
    35 ratios on average; below 400 ratios the ratios themselves are drawn on top. Error bars are
    one standard deviation of the count. verdict: a line above the panels. width: "single" puts two
    panels in a row, "double" four.
    Raises UsageError when there are no ratios, one lies outside the disc or a name is unknown.
    Source of the presentation: L. Sa, P. Ribeiro, T. Prosen, Phys. Rev. X 10, 021019 (2020).
    """
    z = finite_array(ratios, "spacing ratios", np.complex128)
    if np.max(np.abs(z)) > 1 + 1e-9:
        raise UsageError(
            f"a spacing ratio has modulus {np.max(np.abs(z)):.6g}; nearest over next-nearest level "
            "is at most 1"
        )
    if reference_name not in references:
        known = ", ".join(references) or "none"
        raise UsageError(f"no density for reference '{reference_name}'; given are {known}")
    size = column_width(width)
    wide = width == "double"
    lines = [plain(line) for line in textwrap.wrap(verdict, 130 if wide else 60)]
    means = _means_line(mean_ratio, mean_cosine)
    lines += [means] if means else []
    with journal_style():
        figure = figure_of_size(size, (0.31 if wide else 1.02) * size + 0.15 * len(lines))
        shape = (1, 4) if wide else (2, 2)
        data, model, radial, angular = figure.subplots(*shape).ravel().tolist()
        scale = max(float(np.max(density[2])) for density in references.values())
        mesh = _draw_disc(data, disc_histogram(z), scale, "data")
        if z.size < _SCATTERED:
            data.plot(z.real, z.imag, ".", color="white", ms=2.6, mec="black", mew=0.3)
        _draw_disc(model, references[reference_name], scale, reference_label(reference_name))
        model.tick_params(labelleft=False)
        model.set_ylabel("")
        # An inset keeps the bar exactly as high as the disc.
        bar = figure.colorbar(
            mesh, cax=model.inset_axes((1.05, 0.0, 0.06, 1.0)), extend="max", label=r"$p(z)$"
        )
        bar.outline.set_linewidth(0.6)
        _draw_radial(radial, z, references)
        _draw_angular(angular, z, references)
        letter_panels((data, model, radial, angular))
        if lines:
            figure.suptitle("\n".join(lines))
    return figure


def _means_line(ratio: IntervalValues | None, cosine: IntervalValues | None) -> str:
    texts = []
    if ratio is not None:
        texts.append(rf"$\langle r\rangle =$ {interval_text(*ratio)}")
    if cosine is not None:
        texts.append(rf"$\langle\cos\theta\rangle =$ {interval_text(*cosine)}")
    return ",  ".join(texts)


def radial_marginal(density: Density) -> npt.NDArray[np.float64]:
    """p(r) of a density in the disc, mean over each bin of r, float64 (m,); sum p(r) dr = 1."""
    r_edges, theta_edges, pdf = density
    rings = 0.5 * np.diff(r_edges**2) / np.diff(r_edges)
    return 2.0 * (pdf @ np.diff(theta_edges)) * rings


def _angular_marginal(density: Density) -> npt.NDArray[np.float64]:
    """p(theta) on -pi..pi from the bins of |theta|, float64 (k,); 2 sum p(theta) dtheta = 1."""
    r_edges, _, pdf = density
    return (0.5 * np.diff(r_edges**2)) @ pdf


def disc_histogram(z: npt.NDArray[np.complex128]) -> Density:
    """Density of ratios complex128 (n,) on cells of equal area, over the whole circle.

    (r_edges, theta_edges in -pi..pi, pdf), integral 1. Equal areas keep the relative noise equal:
    narrow cells at the centre would flicker.
    """
    cells = max(1.0, z.size / _CELL_LEVELS)
    radial = int(np.clip(round(np.sqrt(cells / 2)), 2, _MOST_CELLS[0]))
    angular = int(np.clip(2 * radial, 6, _MOST_CELLS[1]))
    r_edges = np.sqrt(np.linspace(0.0, 1.0, radial + 1))
    theta_edges = np.linspace(-np.pi, np.pi, angular + 1)
    # A modulus that rounding put beyond 1 belongs to the outermost ring.
    counts, _, _ = np.histogram2d(
        np.minimum(np.abs(z), 1.0), np.angle(z), bins=(r_edges, theta_edges)
    )
    area = np.pi / (radial * angular)
    return r_edges, theta_edges, counts / (z.size * area)


def _draw_disc(axes: Axes, density: Density, scale: float, title: str) -> Any:
    r_edges, theta_edges, pdf = density
    if theta_edges[0] >= 0:
        theta_edges = np.concatenate([-theta_edges[:0:-1], theta_edges])
        pdf = np.hstack([pdf[:, ::-1], pdf])
    # Chords would show as a polygon: each cell is drawn as several thin ones.
    fine = max(1, 144 // pdf.shape[1])
    steps = np.arange(pdf.shape[1] * fine + 1) / fine
    theta = np.interp(steps, np.arange(theta_edges.size), theta_edges)
    x, y = np.outer(r_edges, np.cos(theta)), np.outer(r_edges, np.sin(theta))
    mesh = axes.pcolormesh(
        x,
        y,
        np.repeat(pdf, fine, axis=1),
        cmap=COLOUR_MAP,
        vmin=0.0,
        vmax=scale,
        rasterized=True,
    )
    axes.add_patch(Circle((0.0, 0.0), 1.0, fill=False, lw=0.6))
    axes.set_aspect("equal", adjustable="box")
    axes.set_xlim(-1.08, 1.08)
    axes.set_ylim(-1.08, 1.08)
    axes.set_xticks([-1, 0, 1])
    axes.set_yticks([-1, 0, 1])
    axes.set_xlabel(r"$\mathrm{Re}\,z$", labelpad=1)
    axes.set_ylabel(r"$\mathrm{Im}\,z$", labelpad=0)
    axes.set_title(title, pad=3)
    return mesh


def _points(axes: Axes, values: npt.NDArray[np.float64], edges: npt.NDArray[np.float64]) -> None:
    """Histogram as points with the standard deviation of each count."""
    counts, _ = np.histogram(values, edges)
    scale = 1.0 / (values.size * np.diff(edges))
    axes.errorbar(
        0.5 * (edges[1:] + edges[:-1]),
        counts * scale,
        yerr=np.sqrt(counts) * scale,
        fmt="o",
        color="black",
        ms=2.2,
        lw=0.6,
        zorder=3,
        label="data",
    )


def _bins(count: int) -> int:
    return int(np.clip(round(np.sqrt(count) / 2), 6, 20))


def reference_curves(names: Mapping[str, Any]) -> list[tuple[str, dict[str, Any]]]:
    """Colour and dashes of the curve of each reference, the same in every panel."""
    return [
        (name, {"color": PALETTE[place % len(PALETTE)], "ls": _DASHES[place % len(_DASHES)]})
        for place, name in enumerate(names)
    ]


def _draw_radial(
    axes: Axes,
    z: npt.NDArray[np.complex128],
    references: Mapping[str, Density],
) -> None:
    for name, look in reference_curves(references):
        r_edges = references[name][0]
        middle = 0.5 * (r_edges[1:] + r_edges[:-1])
        values = radial_marginal(references[name])
        axes.plot(middle, values, label=reference_label(name), **look)
    _points(axes, np.minimum(np.abs(z), 1.0), np.linspace(0.0, 1.0, _bins(z.size) + 1))
    axes.set_xlim(0.0, 1.0)
    axes.set_ylim(bottom=0.0)
    axes.set_xlabel(r"$r = |z|$", labelpad=1)
    axes.set_ylabel(r"$p(r)$")
    axes.legend(loc="upper left")


def _draw_angular(
    axes: Axes,
    z: npt.NDArray[np.complex128],
    references: Mapping[str, Density],
) -> None:
    for name, look in reference_curves(references):
        theta_edges = references[name][1]
        middle = 0.5 * (theta_edges[1:] + theta_edges[:-1])
        values = _angular_marginal(references[name])
        axes.plot(
            np.concatenate([-middle[::-1], middle]), np.concatenate([values[::-1], values]), **look
        )
    _points(axes, np.angle(z), np.linspace(-np.pi, np.pi, _bins(z.size) + 1))
    axes.set_xlim(-np.pi, np.pi)
    axes.set_ylim(bottom=0.0)
    axes.set_xticks([-np.pi, 0.0, np.pi], [r"$-\pi$", "0", r"$\pi$"])
    axes.set_xlabel(r"$\theta = \arg z$", labelpad=1)
    axes.set_ylabel(r"$p(\theta)$")
