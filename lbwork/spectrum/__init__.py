"""Eigenvalues of a generator, sector by sector, each with its certificate."""

from lbwork.spectrum.archive import sector_from_archive, sector_to_archive
from lbwork.spectrum.cost import SectorCost, cost_estimate
from lbwork.spectrum.full import full_spectrum, sector_spectrum
from lbwork.spectrum.gap import spectral_gap
from lbwork.spectrum.gap_cost import GapCost, gap_cost
from lbwork.spectrum.options import GapOptions, gap_method
from lbwork.spectrum.records import (
    GapResult,
    SectorSpectrum,
    Spectrum,
    SpectrumCertificate,
    SpectrumOptions,
)
from lbwork.spectrum.scaling import GapScaling, gap_scaling

__all__ = [
    "GapCost",
    "GapOptions",
    "GapResult",
    "GapScaling",
    "SectorCost",
    "SectorSpectrum",
    "Spectrum",
    "SpectrumCertificate",
    "SpectrumOptions",
    "cost_estimate",
    "full_spectrum",
    "gap_cost",
    "gap_method",
    "gap_scaling",
    "sector_from_archive",
    "sector_spectrum",
    "sector_to_archive",
    "spectral_gap",
]
