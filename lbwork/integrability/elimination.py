"""Null spaces of large sparse matrices by eliminating short equations first.

Commutators of strings with a sparse density give many equations with one or two unknowns. One
unknown: it vanishes. Two: one is a multiple of the other. Applied until nothing is left to do,
this takes tens of thousands of unknowns to tens; the remaining core splits into decoupled parts,
whose null spaces come from singular value decompositions. Nothing here is squared, and the caller
recomputes the residual of every vector from the original matrix.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sparse
from scipy.sparse.csgraph import breadth_first_order, connected_components

from lbwork import defaults
from lbwork.integrability.least_squares import (
    check_part,
    components,
    dense_block,
    spectral_bound,
)

__all__ = ["NullSpace", "null_space"]

_SMALLEST_PIVOT = 1e-4
"""Entries below this times the largest are left to the singular value decomposition."""

_LARGEST_RATIO = 50.0
"""Unknowns are tied together only by a ratio between this and its inverse."""


@dataclass(frozen=True, eq=False)
class NullSpace:
    """Vectors v with ``A v = 0`` as sparse columns, and how sharply they are told from the rest.

    ``vectors``: csc (columns of A, dimension), independent but not orthogonal. ``largest_kept`` and
    ``smallest_rejected``: singular values of the reduced core over its norm; the latter is 1 when
    every unknown was eliminated.
    """

    vectors: sparse.csc_matrix
    largest_kept: float
    smallest_rejected: float


def _cleaned(matrix: sparse.csr_matrix, magnitudes: sparse.csr_matrix) -> sparse.csr_matrix:
    """Drop entries that are rounding errors of cancelled sums, then empty rows."""
    if matrix.nnz:
        entries = matrix.tocoo()
        sizes = np.asarray(magnitudes[entries.row, entries.col]).ravel()
        kept = np.abs(entries.data) > 1e-12 * sizes
        matrix = sparse.csr_matrix(
            (entries.data[kept], (entries.row[kept], entries.col[kept])), shape=matrix.shape
        )
    return matrix[np.diff(matrix.indptr) > 0]


def _without_single(
    matrix: sparse.csr_matrix, cut: float
) -> tuple[sparse.csr_matrix, np.ndarray | None]:
    """Remove unknowns that an equation of their own sets to zero; the kept columns or None."""
    single = np.flatnonzero(np.diff(matrix.indptr) == 1)
    places = matrix.indptr[single]
    sure = np.abs(matrix.data[places]) > cut
    if not sure.any():
        return matrix, None
    kept = np.ones(matrix.shape[1], dtype=bool)
    kept[matrix.indices[places[sure]]] = False
    reduced = matrix[:, kept]
    return reduced[np.diff(reduced.indptr) > 0], np.flatnonzero(kept)


def _tied(matrix: sparse.csr_matrix, cut: float) -> sparse.csr_matrix | None:
    """W (unknowns, groups) with x = W y, from a spanning forest of the two-term equations."""
    pairs = np.flatnonzero(np.diff(matrix.indptr) == 2)
    places = matrix.indptr[pairs]
    first, second = matrix.indices[places], matrix.indices[places + 1]
    ratio = -matrix.data[places + 1] / matrix.data[places]
    size = np.abs(ratio)
    sure = (size < _LARGEST_RATIO) & (size > 1 / _LARGEST_RATIO)
    sure &= np.minimum(np.abs(matrix.data[places]), np.abs(matrix.data[places + 1])) > cut
    if not sure.any():
        return None
    first, second, ratio = first[sure], second[sure], ratio[sure]
    # first = ratio * second; several equations may tie the same two, one of them is enough.
    count = matrix.shape[1]
    low, high = np.minimum(first, second), np.maximum(first, second)
    _, chosen = np.unique(low.astype(np.int64) * count + high, return_index=True)
    low_ratio = np.where(first < second, ratio, 1 / ratio)[chosen]
    low, high = low[chosen], high[chosen]
    graph = sparse.coo_matrix((np.ones(low.size), (low, high)), shape=(count, count))
    groups, labels = connected_components(graph, directed=False)
    roots = np.full(groups, count)
    np.minimum.at(roots, labels, np.arange(count))
    # A node that is joined to one unknown of each group makes one tree of all of them.
    rooted = sparse.coo_matrix(
        (
            np.ones(low.size + groups),
            (np.concatenate([low, np.full(groups, count)]), np.concatenate([high, roots])),
        ),
        shape=(count + 1, count + 1),
    ).tocsr()
    _, parent = breadth_first_order(rooted, count, directed=False)
    parent[count] = count
    step = sparse.csr_matrix(
        (
            np.concatenate([low_ratio, 1 / low_ratio]),
            (np.concatenate([low, high]), np.concatenate([high, low])),
        ),
        shape=(count, count),
    )
    weight = np.ones(count + 1, dtype=complex)
    inner = np.flatnonzero(parent[:count] != count)
    weight[inner] = np.asarray(step[inner, parent[inner]]).ravel()
    # Products along the path to the root, by doubling.
    while np.any(parent[:count] != count):
        weight[:count] *= weight[parent[:count]]
        parent[:count] = parent[parent[:count]]
    ties = sparse.csr_matrix((weight[:count], (np.arange(count), labels)), shape=(count, groups))
    lengths = np.sqrt(np.asarray(abs(ties).power(2).sum(axis=0)).ravel())
    return (ties @ sparse.diags_array(1 / lengths)).tocsr()


def _core_null_space(
    matrix: sparse.csc_matrix, largest: float
) -> tuple[sparse.csc_matrix, float, float]:
    """Null space of what cannot be eliminated, decoupled part by decoupled part.

    ``largest``: entry of the whole matrix, beside which a core of rounding errors is nothing.
    """
    norm = max(spectral_bound(matrix), largest)
    cut = defaults.CHARGES_TOLERANCE * norm
    rows_found, columns_found, values = [], [], []
    found, kept, rejected = 0, 0.0, norm
    for rows, columns in components(matrix):
        check_part(rows, columns)
        block = dense_block(matrix, rows, columns)
        if rows.size > columns.size:
            block = np.asarray(np.linalg.qr(block, mode="r"))
        _, singular, right = np.linalg.svd(block, full_matrices=True)
        rank = int(np.sum(singular > cut))
        if rank:
            rejected = min(rejected, float(singular[rank - 1]))
        kept = max(kept, float(singular[rank:].max(initial=0.0)))
        block = right[rank:].conj().T
        place, vector = np.nonzero(np.abs(block) > 1e-13)
        rows_found.append(columns[place])
        columns_found.append(found + vector)
        values.append(block[place, vector])
        found += columns.size - rank
    vectors = sparse.csc_matrix(
        (
            np.concatenate(values or [np.zeros(0)]).astype(complex),
            (
                np.concatenate(rows_found or [np.zeros(0, dtype=int)]),
                np.concatenate(columns_found or [np.zeros(0, dtype=int)]),
            ),
        ),
        shape=(matrix.shape[1], found),
    )
    return vectors, (kept / norm if norm else 0.0), (rejected / norm if norm else 1.0)


def null_space(matrix: sparse.csc_matrix) -> NullSpace:
    """All v with ``matrix @ v = 0``; complex csc. CapacityError when a core part is too large."""
    reduced = matrix.tocsr()
    largest = float(np.abs(reduced.data).max(initial=0.0))
    cut = _SMALLEST_PIVOT * largest
    change = sparse.identity(matrix.shape[1], dtype=complex, format="csr")
    while True:
        reduced, kept = _without_single(reduced, cut)
        if kept is not None:
            change = change[:, kept]
            continue
        ties = _tied(reduced, cut)
        if ties is None:
            break
        reduced = _cleaned((reduced @ ties).tocsr(), (abs(reduced) @ abs(ties)).tocsr())
        change = change @ ties
    vectors, kept_value, rejected = _core_null_space(reduced.tocsc(), largest)
    return NullSpace((change @ vectors).tocsc(), kept_value, rejected)
