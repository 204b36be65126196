"""Level statistics and verdicts as documents, drawn beside the reference ensembles."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from matplotlib.figure import Figure

from lbwork.levels import reference, reference_density, reference_names
from lbwork.report.documents import complex_values, interval_values
from lbwork.report.line_ratios import gap_ratio_figure, means_figure
from lbwork.report.ratios import Density, ratio_figure

__all__ = ["level_figures", "plane_references", "verdict_figures"]

_CLASSES = ("poisson", "A", "AI+", "AII+")


def plane_references(extra: str | None = None) -> dict[str, Density]:
    """Densities of independent levels and of the three bulk classes, and of one more if named.

    That of independent levels is the exact 1/pi, not its sampled table.
    """
    names = list(_CLASSES)
    if extra is not None and extra not in names:
        names.append(extra)
    densities = {name: reference_density(name) for name in names}
    r_edges, theta_edges, table = densities["poisson"]
    densities["poisson"] = (r_edges, theta_edges, np.full_like(table, 1.0 / np.pi))
    return densities


def level_figures(document: Mapping[str, Any], width: str) -> dict[str, Figure]:
    """Ratio figures of a document with "sequences" that hold "ratios"; empty if it has none.

    Sequences are drawn together when they share geometry and expected class, as they are judged:
    the pool with most levels is "levels" and carries the verdict of the document, if any; the
    others are "levels-<class>".
    """
    sequences = document.get("sequences")
    if not isinstance(sequences, Sequence):
        return {}
    pools: dict[tuple[str, str], list[Any]] = {}
    for one in sequences:
        if isinstance(one, Mapping) and one.get("refused") is None and len(one.get("ratios", ())):
            key = (str(one.get("geometry", "plane")), str(one.get("expected_class", "A")))
            pools.setdefault(key, []).append(complex_values(one["ratios"], "spacing ratios"))
    ranked = sorted(pools.items(), key=lambda item: -sum(part.size for part in item[1]))
    figures = {}
    for rank, ((geometry, expected), parts) in enumerate(ranked):
        own = document if rank == 0 and "verdict" in document else {}
        name = "levels" if rank == 0 else f"levels-{expected if geometry == 'plane' else 'line'}"
        figures[name] = _pool_figure(np.concatenate(parts), geometry, expected, own, width)
    return figures


def _pool_figure(
    ratios: np.ndarray, geometry: str, expected: str, verdict: Mapping[str, Any], width: str
) -> Figure:
    headline = _headline(verdict)
    mean_ratio = interval_values(verdict.get("mean_ratio"))
    if geometry == "line":
        return gap_ratio_figure(ratios.real, verdict=headline, mean_ratio=mean_ratio, width=width)
    closest = verdict.get("closest")
    shown = str(closest) if closest in reference_names("plane") else expected
    return ratio_figure(
        ratios,
        plane_references(shown),
        shown,
        verdict=headline,
        mean_ratio=mean_ratio,
        mean_cosine=interval_values(verdict.get("mean_cosine")),
        width=width,
    )


def verdict_figures(document: Mapping[str, Any], title: str, width: str) -> dict[str, Figure]:
    """The two means of a verdict beside those of the references; empty without a mean cosine."""
    if "verdict" not in document:
        return {}
    ratio = interval_values(document.get("mean_ratio"))
    cosine = interval_values(document.get("mean_cosine"))
    if ratio is None or cosine is None:
        return {}
    points = {
        name: (float(reference(name).moments[0, 0]), float(reference(name).moments[1, 0]))
        for name in _CLASSES
    }
    points["poisson"] = (2.0 / 3.0, 0.0)
    levels = document.get("levels_used")
    label = "data" if levels is None else f"{levels} levels"
    return {"means": means_figure({label: (ratio, cosine)}, points, title=title, width=width)}


def _headline(verdict: Mapping[str, Any]) -> str:
    """First sentence of the verdict; the whole stands in the report beside the figure."""
    sentence = str(verdict.get("sentence", verdict.get("verdict", "")))
    first, dot, _ = sentence.partition(". ")
    return first + dot.strip()
