"""Eigenvalues and singular values block by block, with the blocks read off the non-zero entries.

Conserved charges leave density matrices, their partial transposes and their Schmidt matrices block
diagonal in some order of the basis; entries that vanish to rounding decide which.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import scipy.linalg
import scipy.sparse as sparse
from scipy.sparse.csgraph import connected_components

__all__ = ["block_eigenvalues", "block_singular_values"]

_ZERO = 1e-15


def _pattern(matrix: np.ndarray) -> sparse.coo_matrix:
    size = np.abs(matrix)
    rows, columns = np.nonzero(size > _ZERO * size.max(initial=0.0))
    return sparse.coo_matrix((np.ones(rows.size, np.int8), (rows, columns)), shape=matrix.shape)


def _members(labels: np.ndarray, count: int) -> Iterator[np.ndarray]:
    order = np.argsort(labels, kind="stable")
    bounds = np.searchsorted(labels[order], np.arange(count + 1))
    for index in range(count):
        yield order[bounds[index] : bounds[index + 1]]


def block_eigenvalues(matrix: np.ndarray) -> np.ndarray:
    """All eigenvalues of a Hermitian matrix (n, n), float64 (n,), in no particular order."""
    count, labels = connected_components(_pattern(matrix), directed=False)
    return np.concatenate(
        [
            scipy.linalg.eigvalsh(matrix[np.ix_(chosen, chosen)], check_finite=False)
            for chosen in _members(labels, count)
        ]
    )


def block_singular_values(matrix: np.ndarray) -> np.ndarray:
    """The singular values of a matrix (m, n) that do not vanish, float64, in no order."""
    rows, columns = matrix.shape
    pattern = _pattern(matrix)
    joined = sparse.coo_matrix(
        (pattern.data, (pattern.row, rows + pattern.col)), shape=(rows + columns,) * 2
    )
    count, labels = connected_components(joined, directed=False)
    values = []
    for chosen in _members(labels, count):
        upper, lower = chosen[chosen < rows], chosen[chosen >= rows] - rows
        if upper.size and lower.size:
            block = matrix[np.ix_(upper, lower)]
            values.append(scipy.linalg.svdvals(block, check_finite=False))
    return np.concatenate(values) if values else np.zeros(0)
