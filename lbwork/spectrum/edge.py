"""Zero modes and slowest levels of one sector."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sparse

from lbwork import defaults
from lbwork.errors import CapacityError, NotCertifiedError
from lbwork.spectrum.dense import dense_levels
from lbwork.spectrum.options import GapOptions
from lbwork.spectrum.parts import Parts, irreducible_parts, rounding_scale
from lbwork.spectrum.rightmost import SlowLevels, require_decay, rightmost_levels
from lbwork.symmetry import Sector, SectorBlock, SectorPlan

__all__ = ["SectorEdge", "sector_edge"]


@dataclass(frozen=True, eq=False)
class SectorEdge:
    """Zero modes and slowest other levels of one sector (one copy).

    zero_modes, oscillating_modes: numbers of levels; slow: complex128 levels that are not zero,
    slowest first; iterative: whether some part was too large for a dense solve.
    """

    sector: Sector
    zero_modes: int
    oscillating_modes: int
    slow: np.ndarray
    iterative: bool

    @property
    def method(self) -> str:
        """How the levels were found, in words."""
        return "filtered Krylov search, independent starts agree" if self.iterative else "dense"


def _iterative_part(
    matrix: sparse.csr_matrix, options: GapOptions, tolerance: float, label: str
) -> tuple[int, np.ndarray]:
    """Zero modes and slow levels of a large part, agreed on by independent starts."""
    if matrix.shape[0] > defaults.GAP_ITERATIVE_DIMENSION:
        raise CapacityError(
            f"sector '{label}': a part of size {matrix.shape[0]} is above the limit of "
            f"{defaults.GAP_ITERATIVE_DIMENSION} of the gap search; use fewer sites"
        )
    found: list[SlowLevels] = []
    kernels = np.zeros((matrix.shape[0], 0))
    while True:
        number = len(found)
        found.append(
            rightmost_levels(matrix, options.levels, options.seed + number, 1 + 0.07 * number)
        )
        require_decay(found[-1], tolerance, label)
        zero = np.abs(found[-1].levels) <= tolerance
        kernels = np.hstack([kernels, found[-1].vectors[:, zero]])
        strengths = np.linalg.svd(kernels, compute_uv=False) if kernels.size else np.zeros(0)
        rank = int(np.sum(strengths > 1e-6))
        # A start finds one vector of the kernel; as long as each adds a new one there may be more.
        if number + 1 >= options.starts and rank <= number:
            break
    slow = [item.select(np.abs(item.levels) > tolerance) for item in found]
    # Levels come slowest first.
    rates = np.array([-float(item.levels[0].real) for item in slow])
    allowed = defaults.GAP_AGREEMENT_TOLERANCE * float(rates.min()) + tolerance
    if rates.max() - rates.min() > allowed:
        raise NotCertifiedError(
            f"sector '{label}': independent starts give gaps {rates.min():.9g} and "
            f"{rates.max():.9g}; ask for more levels"
        )
    return rank, slow[int(np.argmin(rates))].levels


def _submatrix(matrix: sparse.csr_matrix, parts: Parts, index: int) -> sparse.csr_matrix:
    offset = parts.offsets[index]
    chosen = parts.order[offset : offset + parts.sizes[index]]
    return matrix[chosen][:, chosen].tocsr()


def sector_edge(
    plan: SectorPlan, block: SectorBlock, options: GapOptions, tolerance: float
) -> SectorEdge:
    """Zero modes and slow levels of a sector; each irreducible part is searched on its own.

    ``tolerance`` is the absolute size of a zero mode. Raises CapacityError and NotCertifiedError.
    """
    sector, matrix = block.sector, block.matrix
    parts = irreducible_parts(matrix, rounding_scale(plan, matrix))
    levels = np.asarray(parts.singles(), dtype=complex)
    zero_modes, iterative = int(np.sum(np.abs(levels) <= tolerance)), 0
    slow = [levels[np.abs(levels) > tolerance]]
    for index in np.flatnonzero(parts.sizes > 1):
        size = int(parts.sizes[index])
        if size <= max(options.dense_dimension, defaults.FILTER_SMALLEST_DIMENSION):
            levels = dense_levels(parts.dense(int(index)), defaults.DENSE_THREADS)[0]
            zero_modes += int(np.sum(np.abs(levels) <= tolerance))
            slow.append(levels[np.abs(levels) > tolerance])
            continue
        submatrix = _submatrix(matrix, parts, int(index))
        rank, levels = _iterative_part(submatrix, options, tolerance, sector.label)
        zero_modes += rank
        slow.append(levels)
        iterative += 1
    everything = np.concatenate(slow)
    oscillating = int(np.sum(np.abs(everything.real) <= tolerance))
    order = np.lexsort((-everything.imag, np.abs(everything.imag), -everything.real))
    return SectorEdge(sector, zero_modes, oscillating, everything[order], iterative > 0)
