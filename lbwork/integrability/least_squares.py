"""Sparse least squares and null spaces, solved part by part where rows and columns decouple.

Parts are the connected components of the graph that joins a row and a column with a non-zero
entry. Commutators in a basis of definite charge decouple without being told the charges.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import scipy.sparse as sparse
from scipy.sparse.csgraph import connected_components

from lbwork import defaults
from lbwork.errors import CapacityError

__all__ = ["components", "dense_block", "minimal_solution"]


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


def minimal_solution(
    matrix: sparse.csc_matrix, target: np.ndarray
) -> tuple[np.ndarray, np.ndarray, int]:
    """Shortest x that minimises ``||matrix x - target||``, the residual vector, and the freedom.

    ``target``: complex (rows,). Singular values below ``CHARGES_TOLERANCE`` times the largest of
    the whole matrix count as zero; the freedom is the number of them, the dimension of the null
    space. CapacityError when one decoupled part is too large to be solved densely.
    """
    solution = np.zeros(matrix.shape[1], dtype=complex)
    scale = float(np.sqrt(sparse.linalg.norm(matrix, 1) * sparse.linalg.norm(matrix, np.inf)))
    cut = defaults.CHARGES_TOLERANCE * scale
    freedom = 0
    for rows, columns in components(matrix):
        if rows.size == 0:
            freedom += columns.size
            continue
        entries = rows.size * columns.size
        if entries > defaults.CHARGES_DENSE_ENTRIES:
            raise CapacityError(
                f"a part with {columns.size} unknowns and {rows.size} equations does not decouple; "
                f"at most {defaults.CHARGES_DENSE_ENTRIES:.2g} entries are solved densely"
            )
        block = dense_block(matrix, rows, columns)
        if rows.size > columns.size:
            unitary, block = np.linalg.qr(block)
            reduced = unitary.conj().T @ target[rows]
        else:
            reduced = target[rows]
        left, singular, right = np.linalg.svd(block, full_matrices=False)
        rank = int(np.sum(singular > cut))
        freedom += columns.size - rank
        if np.any(reduced):
            inner = left[:, :rank].conj().T @ reduced / singular[:rank]
            solution[columns] = right[:rank].conj().T @ inner
    return solution, target - matrix @ solution, freedom
