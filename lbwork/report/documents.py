"""Numbers out of documents: the plain forms that results take in JSON and in run files."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
import numpy.typing as npt

from lbwork.errors import UsageError
from lbwork.report.ratios import IntervalValues

__all__ = ["complex_values", "document_of", "interval_values", "real_values", "sector_levels"]

_REAL_TOLERANCE = 1e-10


def document_of(record: object) -> Mapping[str, Any]:
    """The document of a result: itself if it is one, else what its ``to_dict()`` gives.

    Raises UsageError for anything else.
    """
    if isinstance(record, Mapping):
        return record
    convert = getattr(record, "to_dict", None)
    if callable(convert):
        document = convert()
        if isinstance(document, Mapping):
            return document
    raise UsageError(
        f"no figure of a {type(record).__name__}; give a result of lbwork or its to_dict()"
    )


def complex_values(values: Any, name: str) -> npt.NDArray[np.complex128]:
    """Complex128 (n,) from complex numbers or from [re, im] pairs; UsageError otherwise."""
    try:
        array = np.asarray(values)
        if array.ndim == 2 and array.shape[1] == 2 and not np.iscomplexobj(array):
            return array[:, 0].astype(np.float64) + 1j * array[:, 1].astype(np.float64)
        flat = array.astype(np.complex128)
    except (TypeError, ValueError) as error:
        raise UsageError(f"{name} are not numbers or [re, im] pairs: {error}") from error
    if flat.ndim != 1:
        raise UsageError(f"{name} have shape {flat.shape}; give numbers or [re, im] pairs")
    return flat


def real_values(values: Any, name: str) -> npt.NDArray[np.float64]:
    """Real parts of what :func:`complex_values` reads, float64 (n,)."""
    return complex_values(values, name).real


def interval_values(document: Any) -> IntervalValues | None:
    """(value, low, high) of {"value", "low", "high"}; None stays None."""
    if document is None:
        return None
    return float(document["value"]), float(document["low"]), float(document["high"])


def sector_levels(
    sectors: Sequence[Mapping[str, Any]],
) -> list[tuple[str, npt.NDArray[np.complex128], int]]:
    """(label, eigenvalues, multiplicity) of sector documents with "eigenvalues".

    A sector that also stands for copies with the conjugate spectrum shows both halves, unless its
    spectrum is real.
    """
    parts = []
    for place, sector in enumerate(sectors):
        label = str(sector.get("label", f"sector {place + 1}"))
        levels = complex_values(sector["eigenvalues"], f"eigenvalues of sector '{label}'")
        if levels.size == 0:
            continue
        radius = float(np.max(np.abs(levels)))
        real = float(np.max(np.abs(levels.imag))) <= _REAL_TOLERANCE * radius
        if int(sector.get("conjugates", 0)) > 0 and not real:
            levels = np.concatenate([levels, levels.conj()])
        parts.append((label, levels, int(sector.get("multiplicity", 1))))
    return parts
