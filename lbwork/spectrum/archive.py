"""Sector spectra as plain documents and arrays, and back: what a run file keeps."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from lbwork.errors import StoreError
from lbwork.spectrum.records import SectorSpectrum, SpectrumCertificate
from lbwork.symmetry import SectorPlan

__all__ = ["sector_from_archive", "sector_to_archive"]


def sector_to_archive(spectrum: SectorSpectrum) -> tuple[dict[str, Any], dict[str, np.ndarray]]:
    """(document of numbers and words, arrays): ``eigenvalues``, ``error_bounds``, ``parts``."""
    document = {
        **spectrum.sector.to_dict(),
        "real_matrix": spectrum.real_matrix,
        "expected_class": spectrum.expected_class,
        "certificate": spectrum.certificate.to_dict(),
    }
    arrays = {
        "eigenvalues": spectrum.eigenvalues,
        "error_bounds": spectrum.error_bounds,
        "parts": np.array(spectrum.parts, dtype=np.int64),
    }
    return document, arrays


def sector_from_archive(
    plan: SectorPlan, document: Mapping[str, Any], arrays: Mapping[str, np.ndarray]
) -> SectorSpectrum:
    """Rebuild a sector spectrum for the sector of ``plan`` that the document names.

    Raises StoreError when the plan has no such sector or the arrays do not fit it.
    """
    index, label = int(document["index"]), str(document["label"])
    if not 0 <= index < len(plan.sectors) or plan.sectors[index].label != label:
        raise StoreError(
            f"kept sector {index} '{label}' is not in the plan of {plan.model.name}; "
            "the run belongs to another model or another version of the symmetry search"
        )
    sector = plan.sectors[index]
    eigenvalues = np.array(arrays["eigenvalues"], dtype=np.complex128)
    bounds = np.array(arrays["error_bounds"], dtype=np.float64)
    parts = tuple(int(size) for size in arrays["parts"])
    if not eigenvalues.size == bounds.size == sum(parts) == sector.dimension:
        raise StoreError(
            f"kept sector '{label}' holds {eigenvalues.size} levels, {bounds.size} bounds and "
            f"parts of {sum(parts)}; the sector has {sector.dimension}"
        )
    return SectorSpectrum(
        sector=sector,
        eigenvalues=eigenvalues,
        error_bounds=bounds,
        parts=parts,
        real_matrix=bool(document["real_matrix"]),
        expected_class=str(document["expected_class"]),
        certificate=SpectrumCertificate(**document["certificate"]),
    )
