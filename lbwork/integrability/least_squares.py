"""Sparse least squares and null spaces, solved part by part where rows and columns decouple.

Parts are the connected components of the graph that joins a row and a column with a non-zero
entry. Commutators in a basis of definite charge decouple without being told the charges.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sparse
from scipy.sparse.csgraph import connected_components

from lbwork import defaults
from lbwork.errors import CapacityError

__all__ = [
    "Factored",
    "check_part",
    "components",
    "dense_block",
    "factored",
    "spectral_bound",
]


def components(matrix: sparse.csc_matrix) -> Iterator[tuple[np.ndarray, np.ndarray]]:
    """Row and column indices of each decoupled part; rows may be empty, columns are not."""
    rows, columns = matrix.shape
    if columns == 0:
        return
    pattern = matrix.tocoo()
    graph = sparse.coo_matrix(
        (np.ones(pattern.nnz, dtype=np.int8), (pattern.row, rows + pattern.col)),
        shape=(rows + columns, rows + columns),
    )
    count, labels = connected_components(graph, directed=False)
    order = np.argsort(labels, kind="stable")
    bounds = np.searchsorted(labels[order], np.arange(count + 1))
    for part in range(count):
        members = order[bounds[part] : bounds[part + 1]]
        split = int(np.searchsorted(members, rows))
        if split < members.size:
            yield members[:split], members[split:] - rows


def dense_block(matrix: sparse.csc_matrix, rows: np.ndarray, columns: np.ndarray) -> np.ndarray:
    """The dense part of a sparse matrix, without building what lies outside."""
    part = matrix[:, columns].tocoo()
    block = np.zeros((rows.size, columns.size), dtype=matrix.dtype)
    block[np.searchsorted(rows, part.row), part.col] = part.data
    return block


def spectral_bound(matrix: sparse.csc_matrix) -> float:
    """``sqrt(||A||_1 ||A||_inf)``, an upper bound of the largest singular value."""
    if matrix.nnz == 0:
        return 0.0
    return float(np.sqrt(sparse.linalg.norm(matrix, 1) * sparse.linalg.norm(matrix, np.inf)))


@dataclass(frozen=True, eq=False)
class _Part:
    """``A[rows, columns] = Q U diag(s) V^dag``: ``left`` Q U and ``right`` V of the rank kept."""

    rows: np.ndarray
    columns: np.ndarray
    left: np.ndarray
    singular: np.ndarray
    right: np.ndarray
    null: np.ndarray


@dataclass(frozen=True, eq=False)
class Factored:
    """A sparse matrix of the given ``shape``, decoupled and factorised for least squares."""

    shape: tuple[int, int]
    parts: tuple[_Part, ...]

    @property
    def freedom(self) -> int:
        """Dimension of the null space."""
        return sum(part.null.shape[1] for part in self.parts)

    def null_vectors(self) -> sparse.coo_matrix:
        """Orthonormal basis of the null space, coo (columns, freedom)."""
        rows, columns, values, found = [], [], [], 0
        for part in self.parts:
            place, vector = np.nonzero(np.abs(part.null) > 1e-14)
            rows.append(part.columns[place])
            columns.append(found + vector)
            values.append(part.null[place, vector])
            found += part.null.shape[1]
        return sparse.coo_matrix(
            (
                np.concatenate(values or [np.zeros(0)]).astype(complex),
                (
                    np.concatenate(rows or [np.zeros(0, dtype=np.int64)]),
                    np.concatenate(columns or [np.zeros(0, dtype=np.int64)]),
                ),
            ),
            shape=(self.shape[1], found),
        )

    def solve(self, targets: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Shortest least-squares solutions (columns, k) of targets (rows, k), and the residuals."""
        solution = np.zeros((self.shape[1], targets.shape[1]), dtype=complex)
        residual = targets.astype(complex)
        for part in self.parts:
            inner = part.left.conj().T @ targets[part.rows]
            if np.any(inner):
                solution[part.columns] = part.right @ (inner / part.singular[:, None])
                residual[part.rows] -= part.left @ inner
        return solution, residual


def factored(matrix: sparse.csc_matrix) -> Factored:
    """Singular value decompositions of all decoupled parts.

    Singular values below ``CHARGES_TOLERANCE`` times the bound on the largest one of the whole
    matrix count as zero. CapacityError when a part is too large to be treated densely.
    """
    cut = defaults.CHARGES_TOLERANCE * spectral_bound(matrix)
    parts = []
    for rows, columns in components(matrix):
        check_part(rows, columns)
        block = dense_block(matrix, rows, columns)
        unitary = np.eye(rows.size)
        if rows.size > columns.size:
            unitary, block = np.linalg.qr(block)
        left, singular, right = np.linalg.svd(block, full_matrices=True)
        rank = int(np.sum(singular > cut))
        parts.append(
            _Part(
                rows,
                columns,
                unitary @ left[:, :rank],
                singular[:rank],
                right[:rank].conj().T,
                right[rank:].conj().T,
            )
        )
    return Factored((int(matrix.shape[0]), int(matrix.shape[1])), tuple(parts))


def check_part(rows: np.ndarray, columns: np.ndarray) -> None:
    """CapacityError when a decoupled part is too large to be treated densely."""
    if rows.size * columns.size > defaults.CHARGES_DENSE_ENTRIES:
        raise CapacityError(
            f"a part with {columns.size} unknowns and {rows.size} equations does not decouple; at "
            f"most {defaults.CHARGES_DENSE_ENTRIES:.2g} entries are solved densely; ask for "
            "shorter charges"
        )
