"""The Liouvillian gap: slowest levels of every sector, zero modes counted with multiplicity."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import scipy.sparse as sparse
from scipy.sparse.linalg import splu

from lbwork import defaults
from lbwork.errors import NotCertifiedError
from lbwork.generator import Lindbladian, doubled_to_vector
from lbwork.model import Model
from lbwork.spectrum.certificate import level_residual
from lbwork.spectrum.edge import SectorEdge, sector_edge
from lbwork.spectrum.gap_cost import gap_cost
from lbwork.spectrum.nearest import nearest_gap
from lbwork.spectrum.options import GapOptions, gap_method, zero_tolerance
from lbwork.spectrum.parts import rounding_scale
from lbwork.spectrum.populations import population_sectors
from lbwork.spectrum.records import GapResult
from lbwork.spectrum.rightmost import rightmost_levels
from lbwork.symmetry import Sector, SectorBlock, SectorPlan, plan_sectors

__all__ = ["spectral_gap"]

_RESIDUAL_DIMENSION = 3000
_ISOMETRY_ENTRIES = 50_000_000


def _slow_modes(edges: list[SectorEdge], count: int, tolerance: float) -> np.ndarray:
    """The slowest distinct levels over all sectors and their conjugates, (<= count,) complex128."""
    levels = np.concatenate([edge.slow[: 4 * count] for edge in edges])
    mirrored = [edge.slow[: 4 * count].conj() for edge in edges if edge.sector.conjugates]
    levels = np.concatenate([levels, *mirrored])
    distinct: list[complex] = []
    for level in levels[np.lexsort((-levels.imag, np.abs(levels.imag), -levels.real))]:
        if all(abs(level - known) > 10 * tolerance for known in distinct):
            distinct.append(complex(level))
        if len(distinct) == count:
            break
    return np.array(distinct, dtype=complex)


def _sparse_vector(matrix: sparse.csr_matrix, level: complex, scale: float) -> np.ndarray:
    """Eigenvector by inverse iteration with a sparse factorisation, for reducible blocks."""
    # Off the level by a rounding error, so that the factorisation exists.
    shift = level + np.finfo(float).eps * scale
    identity = sparse.identity(matrix.shape[0], dtype=complex, format="csc")
    factors = splu((matrix - shift * identity).tocsc())
    vector = np.random.default_rng(1).normal(size=matrix.shape[0]).astype(complex)
    for _ in range(3):
        vector = factors.solve(vector)
        vector /= np.linalg.norm(vector)
    return np.asarray(vector)


def _sector_vector(
    plan: SectorPlan, block: SectorBlock, edge: SectorEdge, options: GapOptions
) -> np.ndarray:
    """Unit eigenvector (n,) of the whole block for the slowest level of the sector."""
    matrix, level = block.matrix, complex(edge.slow[0])
    if matrix.shape[0] <= _RESIDUAL_DIMENSION:
        generator = np.random.default_rng([options.seed, 1])
        return level_residual(matrix.toarray(), level, generator)[1]
    if edge.iterative:
        found = rightmost_levels(matrix, options.levels, options.seed)
        return found.vectors[:, int(np.argmin(np.abs(found.levels - level)))]
    return _sparse_vector(matrix, level, rounding_scale(plan, matrix))


def _recomputed_residual(
    plan: SectorPlan, edge: SectorEdge, options: GapOptions, generator: Lindbladian
) -> tuple[float, str]:
    """``||L v - lambda v|| / ||L||`` for the slowest level of a sector, and where it was evaluated.

    The vector is carried back to a D x D matrix and the generator applied to it independently,
    when the isometry of the sector fits; otherwise the residual is that of the sector's block.
    """
    block, level = plan.block(edge.sector), complex(edge.slow[0])
    vector = _sector_vector(plan, block, edge, options)
    norm = max(generator.norm_bound, np.finfo(float).tiny)
    rotated = plan.symmetries.rotation is not None
    if plan.total_dimension * (vector.size if rotated else 1) > _ISOMETRY_ENTRIES:
        return float(np.linalg.norm(block.matrix @ vector - level * vector)) / norm, "sector"
    doubled = block.isometry @ vector
    flat = doubled_to_vector(doubled, plan.model.sites, plan.model.local_dimension)
    mode = flat.reshape(generator.dimension, generator.dimension)
    defect = generator.apply(mode) - level * mode
    return float(np.linalg.norm(defect) / np.linalg.norm(mode)) / norm, "density matrix"


def spectral_gap(
    model: Model | SectorPlan,
    *,
    options: GapOptions | None = None,
    progress: Callable[[int, int, Sector], None] | None = None,
    tell: Callable[[str], None] | None = None,
) -> GapResult:
    """The gap ``min -Re lambda`` over all levels that are not zero modes.

    Short chains: exhaustive search of all sectors. Long chains: the levels nearest to zero of the
    sectors of equal ket and bra charge (``tell(words)`` on the way); ``scope`` of the result says
    what was searched. The exhaustive search is dense where a part has at most
    ``options.dense_dimension`` states, otherwise a Krylov search in the exponential of the
    generator from independent starts. Levels on the imaginary axis count as oscillating modes and
    make the gap 0; ``sector_gaps`` lists the slowest rate of each sector.
    ``progress(done, total, sector)`` is called before each sector. Raises CapacityError when a
    sector is too large, NotCertifiedError when starts disagree or the residual, recomputed with the
    generator itself, is above :data:`lbwork.defaults.GAP_RESIDUAL_TOLERANCE`.
    """
    options = options or GapOptions()
    chain = model if isinstance(model, Model) else model.model
    entries = chain.local_dimension ** (2 * chain.sites)
    if gap_method(chain, options) == "nearest":
        report = None if isinstance(model, Model) else model.symmetries
        gap_cost(chain, options, report).require_fit(chain.sites)
        try:
            return nearest_gap(chain, options, report, tell or (lambda words: None))
        except NotCertifiedError as error:
            # Degenerate kernels and structureless chains: every level of the sectors decides.
            affordable = entries <= defaults.GAP_FALLBACK_SPACE
            if options.method != "auto" or error.partial is not None or not affordable:
                raise
            options = replace(options, populations_only=options.populations_only is not False)
    plan = plan_sectors(model) if isinstance(model, Model) else model
    return _exhaustive_gap(plan, options, progress)


def _exhaustive_gap(
    plan: SectorPlan,
    options: GapOptions,
    progress: Callable[[int, int, Sector], None] | None,
) -> GapResult:
    """The gap from every sector's slowest levels."""
    generator = Lindbladian(plan.model)
    tolerance = zero_tolerance(plan.model)
    sectors = population_sectors(plan) if options.populations_only else plan.sectors
    scope = "sectors of equal ket and bra charge" if options.populations_only else "all sectors"
    edges = []
    for done, sector in enumerate(sectors):
        if progress is not None:
            progress(done, len(sectors), sector)
        edges.append(sector_edge(plan, plan.block(sector), options, tolerance))
    zero_modes = sum(edge.zero_modes * edge.sector.multiplicity for edge in edges)
    oscillating = sum(edge.oscillating_modes * edge.sector.multiplicity for edge in edges)
    moving = [edge for edge in edges if edge.slow.size]
    searched = tuple(edge.sector.label for edge in edges)
    methods = tuple(edge.method for edge in edges)
    sector_gaps = tuple(-float(edge.slow[0].real) if edge.slow.size else None for edge in edges)
    if not moving:
        return GapResult(
            0.0,
            None,
            zero_modes,
            0,
            0.0,
            "sector",
            "",
            searched,
            methods,
            sector_gaps,
            np.zeros(0, complex),
            tolerance,
            plan.model,
            scope=scope,
        )
    best = min(moving, key=lambda edge: -edge.slow[0].real)
    level = complex(best.slow[0])
    residual, space = _recomputed_residual(plan, best, options, generator)
    if level.imag < 0:
        level = level.conjugate()
    result = GapResult(
        gap=0.0 if oscillating else -level.real,
        eigenvalue=level,
        zero_modes=zero_modes,
        oscillating_modes=oscillating,
        residual=residual,
        residual_space=space,
        sector=best.sector.label,
        searched=searched,
        methods=methods,
        sector_gaps=sector_gaps,
        slow_modes=_slow_modes(edges, defaults.GAP_LEVELS + 2, tolerance),
        tolerance=tolerance,
        model=plan.model,
        certified=residual <= defaults.GAP_RESIDUAL_TOLERANCE,
        scope=scope,
    )
    if not result.certified:
        raise NotCertifiedError(
            f"gap {result.gap:.9g} of {plan.model.name} has residual {residual:.1e}, limit "
            f"{defaults.GAP_RESIDUAL_TOLERANCE:.0e}; its level is nearly defective",
            result,
        )
    return result
