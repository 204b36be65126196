"""From results to figures: thin adapters between documents and the figures of plain arrays."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from matplotlib.figure import Figure

from lbwork.errors import UsageError
from lbwork.levels import LevelStatistics, judge_levels
from lbwork.report.documents import complex_values, document_of, real_values, sector_levels
from lbwork.report.level_figures import level_figures, verdict_figures
from lbwork.report.profiles import profile_figure
from lbwork.report.scaling import gap_figure, sector_figure
from lbwork.report.spectra import spectrum_figure

__all__ = ["figures_of", "figures_of_run"]

_Document = Mapping[str, Any]


@dataclass(frozen=True)
class _Look:
    title: str
    unit: str
    width: str
    local_dimension: int


def figures_of(
    record: object,
    *,
    title: str = "",
    unit: str = "J",
    width: str = "single",
    local_dimension: int = 2,
) -> dict[str, Figure]:
    """All figures of a result, by name.

    record: Spectrum, SectorPlan, GapResult, SteadyState, LevelStatistics, Verdict, an audit, or
    the document that their ``to_dict()`` gives; complex numbers as numbers or [re, im] pairs. A
    document that holds others gives the figures of all of them, with the keys in front of the
    names.
    Names: "spectrum", "sectors", "slow-modes", "gap", "profile", "levels", "means".
    local_dimension: of one site, where the document does not say.
    Raises UsageError when the record holds nothing that can be drawn.
    """
    look = _Look(title, unit, width, local_dimension)
    document = document_of(record)
    if isinstance(record, LevelStatistics) and record.levels_used:
        document = {**judge_levels(record).to_dict(), **document}
    figures = _collect(document, look)
    if not figures:
        fields = ", ".join(map(str, document)) or "no fields"
        raise UsageError(
            f"nothing to draw in a {type(record).__name__} with {fields}; "
            "spectra, steady states, gaps, level statistics and verdicts have figures"
        )
    return figures


def figures_of_run(run: Any, *, unit: str = "J", width: str = "single") -> dict[str, Figure]:
    """All figures of a kept run (:class:`lbwork.store.RunFile`), by name.

    Its finished sectors make one spectrum; each named result adds its own figures, with the name of
    the result in front where two would clash. Raises UsageError when nothing can be drawn.
    """
    sectors = [{**document, **arrays} for _, document, arrays in run.sectors()]
    name = str(run.header.model_name)
    look = _Look(name, unit, width, 2)
    figures = _collect({"sectors": sectors}, look) if sectors else {}
    for result in run.results():
        record = run.result(result)
        for key, figure in _collect({**record.document, **record.arrays}, look).items():
            figures[key if key not in figures else f"{result}-{key}"] = figure
    if not figures:
        raise UsageError(f"run '{run.run_id}' holds nothing to draw yet; resume it first")
    return figures


def _collect(document: _Document, look: _Look) -> dict[str, Figure]:
    figures: dict[str, Figure] = {}
    for draw in _DRAWERS:
        figures.update(draw(document, look))
    for key, inner in document.items():
        if isinstance(inner, Mapping):
            for name, figure in _collect(inner, look).items():
                figures[name if key == name else f"{key}-{name}"] = figure
    return figures


def _sector_list(document: _Document) -> Sequence[_Document]:
    sectors = document.get("sectors")
    if isinstance(sectors, Sequence) and sectors and isinstance(sectors[0], Mapping):
        return sectors
    return ()


def _spectrum(document: _Document, look: _Look) -> dict[str, Figure]:
    parts = sector_levels([one for one in _sector_list(document) if "eigenvalues" in one])
    if not parts:
        return {}
    gap = document.get("gap")
    number = float(gap) if isinstance(gap, int | float) and math.isfinite(gap) else None
    return {
        "spectrum": spectrum_figure(
            parts, gap=number, title=look.title, unit=look.unit, width=look.width
        )
    }


def _sectors(document: _Document, look: _Look) -> dict[str, Figure]:
    sizes = [
        (str(one.get("label", place + 1)), int(one["dimension"]), int(one.get("multiplicity", 1)))
        for place, one in enumerate(_sector_list(document))
        if "dimension" in one
    ]
    return {"sectors": sector_figure(sizes, title=look.title, width=look.width)} if sizes else {}


def _slow_modes(document: _Document, look: _Look) -> dict[str, Figure]:
    modes, gap = document.get("slow_modes"), document.get("gap")
    # Without a decaying mode there is no finite gap, and nothing slow to look at.
    if modes is None or len(modes) == 0 or gap is None or not math.isfinite(gap):
        return {}
    if isinstance(modes[0], Mapping):
        modes = [one["eigenvalue"] for one in modes]
    levels = complex_values(modes, "slow modes")
    return {
        "slow-modes": spectrum_figure(
            [("slow modes", levels, 1)],
            gap=float(gap),
            title=look.title,
            unit=look.unit,
            width=look.width,
        )
    }


def _scaling(document: _Document, look: _Look) -> dict[str, Figure]:
    if "gaps" not in document or "sizes" not in document:
        return {}
    exponent, error = document.get("exponent"), document.get("exponent_error")
    return {
        "gap": gap_figure(
            real_values(document["sizes"], "sizes"),
            real_values(document["gaps"], "gaps"),
            exponent=None if exponent is None else float(exponent),
            exponent_error=0.0 if error is None else float(error),
            title=look.title,
            unit=look.unit,
            width=look.width,
        )
    }


def _profile(document: _Document, look: _Look) -> dict[str, Figure]:
    if "magnetisation" not in document:
        return {}
    current = document.get("spin_current")
    reason = document.get("current_reason") or "no conserved spin current"
    values = None if current is None else real_values(current, "spin currents")
    if values is not None and values.size == 0:
        # A single site has no bond.
        values, reason = None, "a single site has no bond"
    return {
        "profile": profile_figure(
            np.asarray(document["magnetisation"]),
            values,
            reason=str(reason),
            local_dimension=int(document.get("local_dimension", look.local_dimension)),
            title=look.title,
            unit=look.unit,
            width=look.width,
        )
    }


def _levels(document: _Document, look: _Look) -> dict[str, Figure]:
    return level_figures(document, look.width) or verdict_figures(document, look.title, look.width)


_DRAWERS: tuple[Callable[[_Document, _Look], dict[str, Figure]], ...] = (
    _spectrum,
    _sectors,
    _slow_modes,
    _scaling,
    _profile,
    _levels,
)
