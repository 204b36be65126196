"""Spectra as runs: every finished sector is kept at once, an interrupted run is taken up again."""

from __future__ import annotations

from collections.abc import Callable

from lbwork.errors import StoreError
from lbwork.spectrum import (
    SectorSpectrum,
    Spectrum,
    SpectrumOptions,
    full_spectrum,
    sector_from_archive,
    sector_to_archive,
)
from lbwork.store import RunFile, RunWriter
from lbwork.study.kept import model_of_run
from lbwork.symmetry import Sector, SectorPlan, plan_sectors

__all__ = ["kept_spectrum", "spectrum_of_run"]


def kept_spectrum(
    plan: SectorPlan,
    writer: RunWriter,
    *,
    options: SpectrumOptions | None = None,
    progress: Callable[[int, int, Sector], None] | None = None,
) -> Spectrum:
    """All sectors of a plan; those that ``writer`` holds already are taken from the run.

    Each new sector is on disk before the next one starts. The run is not finished here.
    """
    finished: dict[int, SectorSpectrum] = {}
    for index in writer.finished_sectors():
        record = writer.read_sector(index)
        finished[index] = sector_from_archive(plan, record.document, record.arrays)

    def keep(result: SectorSpectrum) -> None:
        document, arrays = sector_to_archive(result)
        writer.write_sector(result.sector.index, document, arrays)

    return full_spectrum(
        plan, options=options, progress=progress, on_sector=keep, finished=finished
    )


def spectrum_of_run(run: RunFile) -> Spectrum:
    """The spectrum that a finished run holds.

    Raises StoreError when sectors are missing.
    """
    missing = run.missing_sectors()
    if missing:
        raise StoreError(
            f"run '{run.run_id}' lacks {len(missing)} of its sectors; start the same command again "
            "to finish it"
        )
    plan = plan_sectors(model_of_run(run))
    sectors = tuple(
        sector_from_archive(plan, document, arrays) for _, document, arrays in run.sectors()
    )
    if len(sectors) != len(plan.sectors):
        raise StoreError(f"run '{run.run_id}' is a run without a spectrum; use one that has it")
    return Spectrum(plan.model, plan, sectors)
