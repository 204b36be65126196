"""Null vectors of the generator in one sector.

Small sectors: inverse iteration on a block of vectors with one factorisation, which finds the whole
null space whatever its dimension. Large irreducible ones: Krylov search in
the exponential of the generator from independent starts, joined until no new null vector appears.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sparse
from scipy.linalg import lapack
from scipy.sparse.linalg import splu

from lbwork import defaults
from lbwork.errors import CapacityError
from lbwork.provenance import limited_threads
from lbwork.spectrum.rightmost import require_decay, rightmost_levels
from lbwork.symmetry import SectorBlock

__all__ = ["SectorKernel", "sector_kernel"]

Solver = Callable[[np.ndarray, bool], np.ndarray]
"""``solve(columns, adjoint)`` applies the inverse of the shifted block or of its adjoint."""

_SHIFT = 1e-12
_INVERSE_STEPS = 6


@dataclass(frozen=True, eq=False)
class SectorKernel:
    """``right`` (n, m): orthonormal columns with ``B v = 0``; ``left()``: with ``B^dag v = 0``.

    Left vectors are only needed to tell several steady states apart, so they are computed on call.
    ``separation``: size of the next mode that was met, ``||B v||`` (``factorised``) or an
    eigenvalue (``filtered``), infinity where there is none.
    """

    right: np.ndarray
    left: Callable[[], np.ndarray]
    separation: float
    method: str

    @property
    def count(self) -> int:
        """Number of zero modes."""
        return int(self.right.shape[1])


def _dense_solver(matrix: sparse.csr_matrix, shift: float) -> Solver:
    dense = np.asfortranarray(matrix.toarray())
    diagonal = np.arange(matrix.shape[0])
    dense[diagonal, diagonal] -= shift
    real = not np.iscomplexobj(dense)
    factorise, solve = (lapack.dgetrf, lapack.dgetrs) if real else (lapack.zgetrf, lapack.zgetrs)
    factors, pivots, _ = factorise(dense, overwrite_a=1)

    def apply(columns: np.ndarray, adjoint: bool) -> np.ndarray:
        return np.asarray(solve(factors, pivots, columns, trans=(1 if real else 2) * adjoint)[0])

    return apply


def _sparse_solver(matrix: sparse.csr_matrix, shift: float) -> Solver:
    identity = sparse.identity(matrix.shape[0], dtype=matrix.dtype, format="csc")
    factors = splu((matrix.tocsc() - shift * identity).tocsc())

    def apply(columns: np.ndarray, adjoint: bool) -> np.ndarray:
        return np.asarray(factors.solve(columns, trans="H" if adjoint else "N"))

    return apply


def _null_space(
    matrix: sparse.csr_matrix, solve: Solver, tolerance: float, adjoint: bool
) -> tuple[np.ndarray, float]:
    """Orthonormal null vectors of the matrix (of its adjoint), and the size of B on the next."""
    operator = matrix.conj().T.tocsr() if adjoint else matrix
    size = matrix.shape[0]
    count = min(4, size)
    generator = np.random.default_rng(20)
    while True:
        columns = generator.normal(size=(size, count)).astype(matrix.dtype)
        for _ in range(_INVERSE_STEPS):
            columns = np.linalg.qr(solve(columns, adjoint))[0]
        product = operator @ columns
        values, turned = np.linalg.svd(product, full_matrices=False)[1:]
        null = int(np.sum(values <= tolerance))
        if null < count or count == size:
            break
        count = min(2 * count, size)
    kernel = columns @ turned.conj().T[:, count - null :]
    return kernel, float(values[count - null - 1]) if null < count else np.inf


def _factorised_kernel(matrix: sparse.csr_matrix, scale: float, tolerance: float) -> SectorKernel:
    # Every level has a real part <= 0, so a small positive shift keeps the factorisation regular
    # and all zero modes equally dominant; powers of the inverse converge to the null space itself.
    shift = _SHIFT * scale
    dense = matrix.shape[0] <= defaults.STEADY_DENSE_DIMENSION
    solve = (_dense_solver if dense else _sparse_solver)(matrix, shift)
    right, separation = _null_space(matrix, solve, tolerance, False)
    return SectorKernel(
        right, lambda: _null_space(matrix, solve, tolerance, True)[0], separation, "factorised"
    )


def _filtered_side(
    matrix: sparse.csr_matrix, tolerance: float, starts: int, label: str
) -> tuple[np.ndarray, float]:
    """Orthonormal null vectors joined over independent starts, and the smallest other level."""
    kernel = np.zeros((matrix.shape[0], 0))
    size, number = np.inf, 0
    while True:
        found = rightmost_levels(matrix, defaults.GAP_LEVELS, 40 + number, 1 + 0.07 * number)
        require_decay(found, tolerance, label)
        zero = np.abs(found.levels) <= tolerance
        if np.any(~zero):
            size = min(size, float(np.abs(found.levels[~zero]).min()))
        kernel = np.hstack([kernel, found.vectors[:, zero]])
        number += 1
        if kernel.shape[1]:
            left, strengths, _ = np.linalg.svd(kernel, full_matrices=False)
            kernel = left[:, strengths > 1e-6]
        # One start may find one vector of a larger kernel; a start that adds none ends the search.
        if number >= starts and kernel.shape[1] < number:
            return kernel, size


def sector_kernel(
    block: SectorBlock, scale: float, tolerance: float, *, filtered: bool, irreducible: bool
) -> SectorKernel:
    """Zero modes of a sector, right and left.

    ``scale``: norm that rounding is relative to; ``tolerance``: absolute size of a zero mode;
    ``filtered``: use the Krylov search instead of a factorisation; ``irreducible``: whether the
    block is one part (a reducible one is factorised sparsely, it fills in little). Raises
    CapacityError when the block is too large and NotCertifiedError when the search fails.
    """
    matrix = block.matrix
    size = matrix.shape[0]
    if size > defaults.GAP_ITERATIVE_DIMENSION:
        raise CapacityError(
            f"sector '{block.sector.label}': {size} states are above the limit of "
            f"{defaults.GAP_ITERATIVE_DIMENSION} of the zero-mode search; use fewer sites"
        )
    with limited_threads(defaults.DENSE_THREADS):
        if filtered and irreducible and size > defaults.FILTER_SMALLEST_DIMENSION:
            right, separation = _filtered_side(matrix, tolerance, 2, block.sector.label)

            def left() -> np.ndarray:
                adjoint = matrix.conj().T.tocsr()
                return _filtered_side(adjoint, tolerance, 2, block.sector.label)[0]

            return SectorKernel(right, left, separation, "filtered")
        return _factorised_kernel(matrix, scale, tolerance)
