"""All eigenvalues of a model, sector by sector."""

from __future__ import annotations

from collections.abc import Callable, Mapping

import numpy as np

from lbwork import defaults
from lbwork.errors import SymmetryError
from lbwork.model import Model
from lbwork.spectrum.certificate import (
    certify_sector,
    failed_conditions,
    require,
    sample_levels,
)
from lbwork.spectrum.cost import require_memory
from lbwork.spectrum.dense import dense_levels
from lbwork.spectrum.parts import Parts, irreducible_parts, rounding_scale
from lbwork.spectrum.records import (
    SectorSpectrum,
    Spectrum,
    SpectrumOptions,
    expected_class,
)
from lbwork.symmetry import Sector, SectorPlan, plan_sectors

__all__ = ["full_spectrum", "part_levels", "sector_spectrum"]


def part_levels(parts: Parts, threads: int) -> tuple[np.ndarray, np.ndarray]:
    """Eigenvalues and condition numbers of all parts, concatenated in their order, (n,) each.

    Identical parts, which fragmented operator spaces have in great numbers, are solved once.
    """
    eigenvalues = np.empty(parts.order.size, dtype=complex)
    conditions = np.ones(parts.order.size)
    offsets = parts.offsets
    eigenvalues[offsets[parts.sizes == 1]] = parts.singles()
    known: dict[bytes, tuple[np.ndarray, np.ndarray]] = {}
    for index in np.flatnonzero(parts.sizes > 1):
        size = int(parts.sizes[index])
        matrix = parts.dense(int(index))
        if size > defaults.IDENTICAL_PART_DIMENSION:
            solved = dense_levels(matrix, threads)
        else:
            key = matrix.tobytes()
            solved = known.get(key) or dense_levels(matrix, threads)
            known[key] = solved
        inside = slice(offsets[index], offsets[index] + size)
        eigenvalues[inside], conditions[inside] = solved
    return eigenvalues, conditions


def sector_spectrum(
    plan: SectorPlan, sector: Sector, options: SpectrumOptions | None = None
) -> SectorSpectrum:
    """All eigenvalues of the generator in one sector, with error bounds and certificate.

    The same sector gives the same bits on the same machine, whatever was computed before. Raises
    CapacityError before starting what does not fit in memory and NotCertifiedError (with the
    :class:`SectorSpectrum` as ``partial``) when the certificate fails.
    """
    options = options or SpectrumOptions()
    matrix = plan.block(sector).matrix
    real = not np.iscomplexobj(matrix.data)
    norm = rounding_scale(plan, matrix)
    parts = irreducible_parts(matrix, norm)
    require_memory(int(parts.sizes.max()), real, sector.label)
    eigenvalues, conditions = part_levels(parts, options.threads)
    with np.errstate(over="ignore"):
        bounds = (np.finfo(float).eps * norm + parts.dropped) * conditions
    bounds = np.minimum(bounds, norm)
    generator = np.random.default_rng([options.seed, sector.index])
    sampled = sample_levels(parts, eigenvalues, options.samples, generator, options.threads)
    certificate = certify_sector(
        matrix, parts, (eigenvalues, bounds, conditions), sampled, norm, options.threads
    )
    result = SectorSpectrum(
        sector=sector,
        eigenvalues=eigenvalues,
        error_bounds=bounds,
        parts=tuple(int(size) for size in parts.sizes),
        real_matrix=real,
        expected_class=expected_class(sector.transposition),
        certificate=certificate,
    )
    require(failed_conditions(certificate, eigenvalues, bounds, norm), sector.label, result)
    return result


def full_spectrum(
    model: Model | SectorPlan,
    *,
    options: SpectrumOptions | None = None,
    progress: Callable[[int, int, Sector], None] | None = None,
    on_sector: Callable[[SectorSpectrum], None] | None = None,
    finished: Mapping[int, SectorSpectrum] | None = None,
) -> Spectrum:
    """The spectra of all sectors of a model or of a plan already made.

    ``progress(done, total, sector)`` is called before each sector that is computed; ``on_sector``
    receives each new result, e.g. to keep it; sectors whose index is in ``finished`` are taken from
    there. Every sector is checked against the memory before the first one starts. Raises what
    :func:`sector_spectrum` raises, and SymmetryError when sizes times copies do not add up to
    ``d**(2L)``.
    """
    plan = plan_sectors(model) if isinstance(model, Model) else model
    total = sum(sector.dimension * sector.multiplicity for sector in plan.sectors)
    if total != plan.total_dimension:
        raise SymmetryError(
            f"sectors hold {total} levels, the space has {plan.total_dimension}; "
            "a sector is missing from the plan"
        )
    kept = dict(finished or {})
    results = []
    for done, sector in enumerate(plan.sectors):
        if sector.index in kept:
            results.append(kept[sector.index])
            continue
        if progress is not None:
            progress(done, len(plan.sectors), sector)
        results.append(sector_spectrum(plan, sector, options))
        if on_sector is not None:
            on_sector(results[-1])
    return Spectrum(plan.model, plan, tuple(results))
