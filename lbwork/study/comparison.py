"""Two kept runs side by side: same model, same numbers?"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.spatial import cKDTree

from lbwork.store import RunFile

__all__ = ["Comparison", "Difference", "compare_runs"]


@dataclass(frozen=True)
class Difference:
    """One quantity of two runs; ``difference`` is None when it is not a number on both sides."""

    quantity: str
    first: Any
    second: Any
    difference: float | None

    def to_dict(self) -> dict[str, Any]:
        """A JSON document of the four fields."""
        return {
            "quantity": self.quantity,
            "first": self.first,
            "second": self.second,
            "difference": self.difference,
        }


@dataclass(frozen=True)
class Comparison:
    """What two runs share and where they differ.

    ``levels``: per sector label, the largest distance of a level to the other run's levels.
    """

    first: str
    second: str
    same_model: bool
    same_options: bool
    quantities: tuple[Difference, ...]
    levels: Mapping[str, float]
    only_first: tuple[str, ...]
    only_second: tuple[str, ...]

    def to_dict(self) -> dict[str, Any]:
        """A JSON document of all fields."""
        return {
            "first": self.first,
            "second": self.second,
            "same_model": self.same_model,
            "same_options": self.same_options,
            "quantities": [item.to_dict() for item in self.quantities],
            "levels": dict(self.levels),
            "only_first": list(self.only_first),
            "only_second": list(self.only_second),
        }


def _scalars(document: Any, path: str = "") -> Iterator[tuple[str, Any]]:
    """Numbers, words and truth values of a document with their dotted names; short lists too."""
    if isinstance(document, Mapping):
        for key, value in document.items():
            yield from _scalars(value, f"{path}.{key}" if path else str(key))
    elif isinstance(document, Sequence) and not isinstance(document, str):
        if len(document) <= 64 and all(isinstance(item, int | float) for item in document):
            for index, item in enumerate(document, start=1):
                yield f"{path}[{index}]", item
    elif document is not None:
        yield path, document


def _quantities(run: RunFile) -> dict[str, Any]:
    found: dict[str, Any] = {}
    for name in run.results():
        found.update(_scalars(run.result(name).document, name))
    return found


def _number(value: Any) -> float | None:
    return float(value) if isinstance(value, int | float) and not isinstance(value, bool) else None


def _level_distance(one: np.ndarray, two: np.ndarray) -> float:
    points = [np.column_stack([levels.real, levels.imag]) for levels in (one, two)]
    there = cKDTree(points[1]).query(points[0])[0].max()
    back = cKDTree(points[0]).query(points[1])[0].max()
    return float(max(there, back))


def compare_runs(first: RunFile, second: RunFile) -> Comparison:
    """Compare results by name and spectra sector by sector (by label, as sets)."""
    one, two = _quantities(first), _quantities(second)
    rows = []
    for name in one:
        if name in two:
            a, b = _number(one[name]), _number(two[name])
            difference = abs(a - b) if a is not None and b is not None else None
            rows.append(Difference(name, one[name], two[name], difference))
    levels_one = {document["label"]: arrays for _, document, arrays in first.sectors()}
    levels_two = {document["label"]: arrays for _, document, arrays in second.sectors()}
    levels = {
        label: _level_distance(arrays["eigenvalues"], levels_two[label]["eigenvalues"])
        for label, arrays in levels_one.items()
        if label in levels_two
    }
    return Comparison(
        first=first.run_id,
        second=second.run_id,
        same_model=first.header.identity == second.header.identity,
        same_options=first.header.options_text == second.header.options_text,
        quantities=tuple(rows),
        levels=levels,
        only_first=tuple(sorted({*one, *levels_one} - {*two, *levels_two})),
        only_second=tuple(sorted({*two, *levels_two} - {*one, *levels_one})),
    )
