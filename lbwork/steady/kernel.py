"""Null vectors of the generator in one sector.

Small sectors: inverse iteration on a block of vectors with one factorisation, which converges to
the smallest singular values whatever their multiplicity. Large irreducible ones: Krylov search in
the exponential of the generator from independent starts, joined until no new null vector appears.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sparse
from scipy.linalg import lapack
from scipy.sparse.linalg import splu
from threadpoolctl import threadpool_limits

from lbwork import defaults
from lbwork.errors import CapacityError
from lbwork.spectrum.rightmost import rightmost_levels
from lbwork.symmetry import SectorBlock

__all__ = ["SectorKernel", "sector_kernel"]

Solver = Callable[[np.ndarray, bool], np.ndarray]
"""``solve(columns, adjoint)`` applies the inverse of the block or of its adjoint."""


@dataclass(frozen=True, eq=False)
class SectorKernel:
    """``right`` (n, m): orthonormal columns with ``B v = 0``; ``left()``: with ``B^dag v = 0``.

    Left vectors are only needed to tell several steady states apart, so they are computed on call.
    ``separation``: size of the smallest mode that is not zero, a singular value (``factorised``) or
    an eigenvalue (``filtered``); infinity where there is no other mode.
    """

    right: np.ndarray
    left: Callable[[], np.ndarray]
    separation: float
    method: str

    @property
    def count(self) -> int:
        """Number of zero modes."""
        return int(self.right.shape[1])


def _dense_solver(matrix: sparse.csr_matrix, scale: float) -> Solver:
    dense = np.asfortranarray(matrix.toarray())
    real = not np.iscomplexobj(dense)
    factorise, solve = (lapack.dgetrf, lapack.dgetrs) if real else (lapack.zgetrf, lapack.zgetrs)
    factors, pivots, _ = factorise(dense, overwrite_a=1)
    # The block is singular when it has a zero mode: keep the direction, avoid the division by zero.
    smallest = np.finfo(float).eps * scale * 1e-3
    diagonal = np.arange(matrix.shape[0])
    tiny = diagonal[np.abs(factors[diagonal, diagonal]) < smallest]
    factors[tiny, tiny] = smallest

    def apply(columns: np.ndarray, adjoint: bool) -> np.ndarray:
        return np.asarray(solve(factors, pivots, columns, trans=(1 if real else 2) * adjoint)[0])

    return apply


def _sparse_solver(matrix: sparse.csr_matrix, scale: float) -> Solver:
    # Every level has a real part <= 0: a tiny positive shift keeps the factorisation regular.
    shift = 10 * np.finfo(float).eps * scale
    identity = sparse.identity(matrix.shape[0], dtype=matrix.dtype, format="csc")
    factors = splu((matrix.tocsc() - shift * identity).tocsc())

    def apply(columns: np.ndarray, adjoint: bool) -> np.ndarray:
        return np.asarray(factors.solve(columns, trans="H" if adjoint else "N"))

    return apply


def _orthonormal(columns: np.ndarray) -> np.ndarray:
    # Inverse iteration makes columns of very different size; scaling keeps the small ones.
    columns = columns / np.linalg.norm(columns, axis=0)
    return np.asarray(np.linalg.qr(columns)[0])


def _smallest_singular(
    matrix: sparse.csr_matrix, solve: Solver, count: int, adjoint: bool
) -> tuple[np.ndarray, np.ndarray]:
    """The ``count`` smallest singular values, ascending, with right (left if adjoint) vectors."""
    generator = np.random.default_rng(20)
    columns = generator.normal(size=(matrix.shape[0], count)).astype(matrix.dtype)
    for _ in range(4):
        columns = _orthonormal(solve(columns, not adjoint))
        columns = _orthonormal(solve(columns, adjoint))
    product = (matrix.conj().T if adjoint else matrix) @ columns
    _, values, turned = np.linalg.svd(product, full_matrices=False)
    return values[::-1], (columns @ turned.conj().T)[:, ::-1]


def _factorised_kernel(matrix: sparse.csr_matrix, solve: Solver, tolerance: float) -> SectorKernel:
    size = matrix.shape[0]
    count = min(4, size)
    while True:
        values, right = _smallest_singular(matrix, solve, count, False)
        null = int(np.sum(values <= tolerance))
        if null < count or count == size:
            break
        count = min(2 * count, size)

    def left() -> np.ndarray:
        return _smallest_singular(matrix, solve, count, True)[1][:, :null]

    separation = float(values[null]) if null < count else np.inf
    return SectorKernel(right[:, :null], left, separation, "factorised")


def _filtered_side(
    matrix: sparse.csr_matrix, tolerance: float, starts: int
) -> tuple[np.ndarray, float]:
    """Orthonormal null vectors joined over independent starts, and the smallest other level."""
    kernel = np.zeros((matrix.shape[0], 0))
    size, number = np.inf, 0
    while True:
        found = rightmost_levels(matrix, defaults.GAP_LEVELS, 40 + number, 1 + 0.07 * number)
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
    with threadpool_limits(limits=defaults.DENSE_THREADS):
        if filtered and irreducible:
            right, separation = _filtered_side(matrix, tolerance, 2)

            def left() -> np.ndarray:
                return _filtered_side(matrix.conj().T.tocsr(), tolerance, 2)[0]

            return SectorKernel(right, left, separation, "filtered")
        if size <= defaults.STEADY_DENSE_DIMENSION:
            return _factorised_kernel(matrix, _dense_solver(matrix, scale), tolerance)
        return _factorised_kernel(matrix, _sparse_solver(matrix, scale), tolerance)
