"""Irreducible parts of a sparse block.

Ordering the strongly connected components of the pattern makes a matrix block-triangular, and the
spectrum of a block-triangular matrix is the union of the spectra of its diagonal blocks. Pure loss,
one-way hopping and fragmented operator spaces fall into many small parts this way.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sparse
from scipy.sparse.csgraph import connected_components

from lbwork import defaults
from lbwork.symmetry import SectorPlan

__all__ = ["Parts", "block_norm", "irreducible_parts", "rounding_scale"]


def block_norm(matrix: sparse.csr_matrix) -> float:
    """Upper bound of the 2-norm, ``sqrt(||B||_1 ||B||_inf)``."""
    magnitude = abs(matrix)
    columns = np.asarray(magnitude.sum(axis=0)).ravel()
    rows = np.asarray(magnitude.sum(axis=1)).ravel()
    return float(np.sqrt(columns.max(initial=0.0) * rows.max(initial=0.0)))


def rounding_scale(plan: SectorPlan, matrix: sparse.csr_matrix) -> float:
    """The size that rounding errors of a sector block are relative to.

    Norm of the block, or the largest local term where the block itself cancels to (nearly) nothing:
    it was added up from such terms. 1 for a generator that is zero.
    """
    local = [float(np.abs(term).max()) for term in plan.symmetries.terms.values()]
    return max([block_norm(matrix), *local]) or 1.0


@dataclass(frozen=True, eq=False)
class Parts:
    """Diagonal blocks of a square matrix after reordering.

    ``order`` (n,) int64: basis states part by part; ``sizes`` (p,) int64, ordered by the smallest
    basis index in each part; ``dropped``: Frobenius norm of the entries treated as zero.
    ``rows``, ``columns``, ``values`` are the entries inside parts with local indices, part by part;
    those of part k start at ``pointer[k]``.
    """

    order: np.ndarray
    sizes: np.ndarray
    dropped: float
    rows: np.ndarray
    columns: np.ndarray
    values: np.ndarray
    pointer: np.ndarray

    @property
    def offsets(self) -> np.ndarray:
        """Start of each part in ``order``, (p,) int64."""
        return np.cumsum(self.sizes) - self.sizes

    def dense(self, index: int) -> np.ndarray:
        """Part ``index`` as a Fortran-ordered dense array, ready for LAPACK."""
        size = int(self.sizes[index])
        inside = slice(self.pointer[index], self.pointer[index + 1])
        matrix = np.zeros((size, size), dtype=self.values.dtype, order="F")
        matrix[self.rows[inside], self.columns[inside]] = self.values[inside]
        return matrix

    def singles(self) -> np.ndarray:
        """Diagonal entries of the parts of size one, (number of those,) in order of parts."""
        single = np.flatnonzero(self.sizes == 1)
        entries = np.zeros(self.sizes.size, dtype=self.values.dtype)
        part_of = np.repeat(np.arange(self.sizes.size), np.diff(self.pointer))
        np.add.at(entries, part_of, np.where(self.sizes[part_of] == 1, self.values, 0))
        return entries[single]

    def __iter__(self) -> Iterator[int]:
        return iter(range(self.sizes.size))


def irreducible_parts(matrix: sparse.csr_matrix, scale: float) -> Parts:
    """Split a square csr block into its strongly connected parts.

    Entries below :data:`lbwork.defaults.PART_DROP_TOLERANCE` times ``scale`` (see
    :func:`rounding_scale`) are left over from the change to the sector basis and count as zero.
    """
    entries = matrix.tocoo()
    dimension = matrix.shape[0]
    kept = np.abs(entries.data) > defaults.PART_DROP_TOLERANCE * scale
    dropped = float(np.linalg.norm(entries.data[~kept]))
    row, column, data = entries.row[kept], entries.col[kept], entries.data[kept]
    pattern = sparse.csr_matrix(
        (np.ones(data.size, dtype=np.int8), (row, column)), shape=matrix.shape
    )
    count, labels = connected_components(pattern, directed=True, connection="strong")
    first = np.full(count, dimension, dtype=np.int64)
    np.minimum.at(first, labels, np.arange(dimension))
    rank = np.empty(count, dtype=np.int64)
    rank[np.argsort(first)] = np.arange(count)
    labels = rank[labels]
    sizes = np.bincount(labels, minlength=count).astype(np.int64)
    order = np.argsort(labels, kind="stable")
    place = np.empty(dimension, dtype=np.int64)
    place[order] = np.arange(dimension)
    inside = labels[row] == labels[column]
    row, column, data = row[inside], column[inside], data[inside]
    sequence = np.lexsort((column, row, labels[row]))
    row, column, data = row[sequence], column[sequence], data[sequence]
    offsets = np.cumsum(sizes) - sizes
    part_of = labels[row]
    pointer = np.concatenate([[0], np.cumsum(np.bincount(part_of, minlength=count))])
    return Parts(
        order=order,
        sizes=sizes,
        dropped=dropped,
        rows=place[row] - offsets[part_of],
        columns=place[column] - offsets[part_of],
        values=data,
        pointer=pointer,
    )
