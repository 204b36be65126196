"""Local operators on the whole chain as sparse matrices, by index arithmetic."""

from __future__ import annotations

import numpy as np
import scipy.sparse as sparse

__all__ = ["embed"]


def embed(
    matrix: np.ndarray, positions: tuple[int, ...], count: int, dimension: int
) -> sparse.csr_matrix:
    """An operator on some tensor factors of ``count`` factors of equal dimension.

    ``positions`` are the 0-based factors in the order of the operator's own factors, adjacent or
    not. Returns complex csr (dimension**count, dimension**count).
    """
    local = sparse.coo_matrix(matrix)
    weights = np.array([dimension ** (count - 1 - position) for position in positions])
    powers = dimension ** np.arange(len(positions) - 1, -1, -1)
    local_digits = (np.arange(matrix.shape[0])[:, None] // powers) % dimension
    placed = local_digits @ weights
    others = [position for position in range(count) if position not in positions]
    rest = np.zeros(1, dtype=np.int64)
    for position in others:
        step = dimension ** (count - 1 - position) * np.arange(dimension)
        rest = (rest[:, None] + step[None, :]).ravel()
    rows = (placed[local.row][:, None] + rest[None, :]).ravel()
    columns = (placed[local.col][:, None] + rest[None, :]).ravel()
    values = np.repeat(local.data.astype(complex), rest.size)
    size = dimension**count
    return sparse.csr_matrix((values, (rows, columns)), shape=(size, size))
