"""Eigenvalues block by block, with the blocks read off the non-zero entries.

Conserved charges leave density matrices, their partial transposes and their Schmidt matrices block
diagonal in some order of the basis; the entries that do not vanish tell which, with no charge to be
named. Blocks without imaginary parts are solved as real ones.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import scipy.linalg

__all__ = [
    "NEGLIGIBLE",
    "block_eigenvalues",
    "block_gram_eigenvalues",
    "hermitian_blocks",
    "real_if_close",
    "rectangular_blocks",
]

NEGLIGIBLE = 1e-15
"""Entries below this times the largest one count as zero: they move no eigenvalue by more than
their number times it, which is rounding."""

_SLAB = 2**20


def _slabs(matrix: np.ndarray) -> Iterator[slice]:
    """Rows in portions of about a million entries: no temporary of the size of the matrix."""
    step = max(1, _SLAB // max(matrix.shape[1], 1))
    for start in range(0, matrix.shape[0], step):
        yield slice(start, start + step)


def _largest(matrix: np.ndarray) -> float:
    return max((float(np.abs(matrix[rows]).max()) for rows in _slabs(matrix)), default=0.0)


def _pattern(matrix: np.ndarray) -> np.ndarray:
    """Where the entries do not vanish, boolean (m, n)."""
    bound = NEGLIGIBLE * _largest(matrix)
    pattern = np.empty(matrix.shape, dtype=bool)
    for rows in _slabs(matrix):
        np.greater(np.abs(matrix[rows]), bound, out=pattern[rows])
    return pattern


def hermitian_blocks(*matrices: np.ndarray) -> list[np.ndarray]:
    """Index sets that no entry of any of the Hermitian matrices (n, n) joins, int64 (n_b,) each.

    They are sorted and together hold 0..n-1.
    """
    pattern = _pattern(matrices[0])
    for matrix in matrices[1:]:
        pattern |= _pattern(matrix)
    size = len(pattern)
    free = np.ones(size, dtype=bool)
    blocks = []
    for first in range(size):
        if not free[first]:
            continue
        member = np.zeros(size, dtype=bool)
        frontier = np.array([first])
        while frontier.size:
            member[frontier] = True
            frontier = np.flatnonzero(pattern[frontier].any(axis=0) & ~member)
        free &= ~member
        blocks.append(np.flatnonzero(member))
    return blocks


def rectangular_blocks(matrix: np.ndarray) -> list[tuple[np.ndarray, np.ndarray]]:
    """Rows and columns of the blocks of a matrix (m, n); those that vanish are left out."""
    pattern = _pattern(matrix)
    free = np.asarray(pattern.any(axis=1))
    blocks = []
    for first in range(len(pattern)):
        if not free[first]:
            continue
        rows = np.zeros(pattern.shape[0], dtype=bool)
        columns = np.zeros(pattern.shape[1], dtype=bool)
        frontier = np.array([first])
        while frontier.size:
            rows[frontier] = True
            reached = np.flatnonzero(pattern[frontier].any(axis=0) & ~columns)
            columns[reached] = True
            frontier = np.flatnonzero(pattern[:, reached].any(axis=1) & ~rows)
        free &= ~rows
        blocks.append((np.flatnonzero(rows), np.flatnonzero(columns)))
    return blocks


def real_if_close(matrix: np.ndarray) -> np.ndarray:
    """The real part where the imaginary one vanishes to rounding, else the matrix itself."""
    if not np.iscomplexobj(matrix):
        return matrix
    if _largest(matrix.imag) <= NEGLIGIBLE * _largest(matrix):
        return np.asarray(matrix.real.copy())
    return matrix


def _eigenvalues(matrix: np.ndarray, disposable: bool) -> np.ndarray:
    block = real_if_close(matrix)
    if block.shape == (1, 1):
        return np.array([block[0, 0].real])
    # The transpose has the same eigenvalues and the memory order LAPACK works in: no copy.
    spare = disposable or block is not matrix
    return np.asarray(scipy.linalg.eigvalsh(block.T, overwrite_a=spare, check_finite=False))


def block_eigenvalues(matrix: np.ndarray, disposable: bool = False) -> np.ndarray:
    """All eigenvalues of a Hermitian matrix (n, n), float64 (n,), in no particular order.

    ``disposable``: the matrix may be overwritten.
    """
    blocks = hermitian_blocks(matrix)
    if len(blocks) == 1:
        return _eigenvalues(matrix, disposable)
    return np.concatenate([_eigenvalues(matrix[np.ix_(chosen, chosen)], True) for chosen in blocks])


def block_gram_eigenvalues(matrix: np.ndarray) -> np.ndarray:
    """Squares of the singular values of a matrix (m, n), float64, in no particular order.

    Taken from ``A A^dag`` or ``A^dag A``, whichever is smaller: three times faster than singular
    values, at an absolute error of rounding times the largest square. Rows and columns that vanish
    contribute none.
    """
    values = [np.zeros(0)]
    for rows, columns in rectangular_blocks(matrix):
        whole = rows.size == matrix.shape[0] and columns.size == matrix.shape[1]
        block = real_if_close(matrix if whole else matrix[np.ix_(rows, columns)])
        narrow = block if rows.size <= columns.size else block.T
        values.append(_eigenvalues(narrow @ narrow.conj().T, True))
    return np.concatenate(values)
