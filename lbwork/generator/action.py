"""Matrix-free application of a generator to a density matrix, threads over blocks of rows.

``L(rho) = A rho + rho A^dag + sum_k l_k rho l_k^dag`` with sparse ``A`` and ``l_k`` of dimension
``D = d**L`` (rates absorbed). Everything diagonal is one factor per element,
``W_ij = A_ii + A_jj* + sum_k l_k(i) l_k(j)*``, kept as one D x D array (real where possible). With
the off-diagonal part of A written as ``x + i y`` the two products are

    ``A rho + rho A^dag = (x rho + rho x^T) + i (y rho - rho y^T)``,

so that every inner loop multiplies a run of doubles by one real number: rows of rho on the left, a
transposed tile of a few rows on the right. Besides input and output only W, row buffers and
D x D-sparse operators are held, never a matrix of dimension ``D**2``.
"""

from __future__ import annotations

from dataclasses import dataclass

import numba
import numpy as np
import scipy.sparse as sparse

__all__ = ["ActionTables", "action_tables", "apply_tables"]


TILE = 4


@dataclass(frozen=True, eq=False)
class ActionTables:
    """Flat arrays that the compiled kernel reads.

    ``real`` and ``imaginary``: csr arrays (pointers, columns, values) of x and y; ``weights``: W,
    float64 or complex128 (D, D); ``jumps``: csr arrays of the off-diagonal jumps, stacked;
    ``entries``: the same jumps as (row, column, conjugated value) lists with ``entry_pointers``
    (K + 1,).
    """

    dimension: int
    real: tuple[np.ndarray, np.ndarray, np.ndarray]
    imaginary: tuple[np.ndarray, np.ndarray, np.ndarray]
    weights: np.ndarray
    jumps: tuple[np.ndarray, np.ndarray, np.ndarray]
    entries: tuple[np.ndarray, np.ndarray, np.ndarray]
    entry_pointers: np.ndarray


def _real_if_possible(values: np.ndarray) -> np.ndarray:
    """Float64 when no imaginary part is there: the kernel is compiled for both."""
    kept = values.real if np.iscomplexobj(values) and not np.any(values.imag) else values
    return np.ascontiguousarray(kept)


def _csr_arrays(matrix: sparse.csr_matrix) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    matrix.eliminate_zeros()
    return (
        matrix.indptr.astype(np.int64),
        matrix.indices.astype(np.int32),
        _real_if_possible(matrix.data),
    )


def _weights(diagonal: np.ndarray, factors: list[np.ndarray]) -> np.ndarray:
    """W, real when every entry is."""
    real = bool(
        np.all([np.all(factor.imag == 0) for factor in factors]) and np.all(diagonal.imag == 0)
    )
    if real:
        weights = diagonal.real[:, None] + diagonal.real[None, :]
        table = np.array([factor.real for factor in factors]).reshape(len(factors), diagonal.size)
    else:
        weights = diagonal[:, None] + diagonal.conj()[None, :]
        table = np.array(factors, dtype=complex).reshape(len(factors), diagonal.size)
    weights += table.T @ table.conj()
    return np.ascontiguousarray(weights)


def action_tables(a: sparse.csr_matrix, jumps: list[sparse.csr_matrix]) -> ActionTables:
    """Prepare the tables from ``A`` and the jump operators (rates absorbed), all (D, D)."""
    dimension = a.shape[0]
    diagonal = np.ascontiguousarray(a.diagonal(), dtype=np.complex128)
    left = (a - sparse.diags_array(diagonal, format="csr")).tocsr()
    left.eliminate_zeros()
    factors, others = [], []
    for jump in jumps:
        values = jump.diagonal()
        if jump.nnz == np.count_nonzero(values):
            factors.append(values)
        else:
            others.append(jump.tocsr())
    empty = sparse.csr_matrix((0, dimension), dtype=complex)
    stacked = sparse.vstack(others, format="csr") if others else empty
    lists = [jump.tocoo() for jump in others]
    joined = (
        np.concatenate([item.row for item in lists] or [np.zeros(0)]).astype(np.int32),
        np.concatenate([item.col for item in lists] or [np.zeros(0)]).astype(np.int32),
        _real_if_possible(np.concatenate([item.data.conj() for item in lists] or [np.zeros(0)])),
    )
    pointers = np.cumsum([0, *(item.nnz for item in lists)]).astype(np.int64)
    weights = _weights(diagonal, factors)
    return ActionTables(
        dimension,
        _csr_arrays(left.real.tocsr()),
        _csr_arrays(left.imag.tocsr()),
        weights,
        _csr_arrays(stacked),
        joined,
        pointers,
    )


@numba.njit(cache=True, fastmath={"nsz", "contract", "reassoc"})
def _add_rows(i, rho, pointer, column, value, total):  # pragma: no cover
    """``total += sum_k value[i, k] rho[k]`` on doubles, four rows at a time."""
    position, last = pointer[i], pointer[i + 1]
    while last - position >= 4:
        a, b = value[position], value[position + 1]
        c, d = value[position + 2], value[position + 3]
        first, second = rho[column[position]], rho[column[position + 1]]
        third, fourth = rho[column[position + 2]], rho[column[position + 3]]
        for j in range(total.size):
            total[j] += a * first[j] + b * second[j] + c * third[j] + d * fourth[j]
        position += 4
    while last - position >= 2:
        a, b = value[position], value[position + 1]
        first, second = rho[column[position]], rho[column[position + 1]]
        for j in range(total.size):
            total[j] += a * first[j] + b * second[j]
        position += 2
    if position < last:
        a, first = value[position], rho[column[position]]
        for j in range(total.size):
            total[j] += a * first[j]


@numba.njit(cache=True, fastmath={"nsz", "contract", "reassoc"})
def _add_columns(tile, pointer, column, value, sign, total):  # pragma: no cover
    """``total[b] += sign * (rho M^T)[b]`` for the rows b whose transpose is in ``tile``."""
    sums = np.empty(2 * TILE)
    for j in range(tile.shape[0]):
        sums[:] = 0.0
        for position in range(pointer[j], pointer[j + 1]):
            factor = sign * value[position]
            source = tile[column[position]]
            for b in range(2 * TILE):
                sums[b] += factor * source[b]
        for b in range(total.shape[0]):
            total[b, 2 * j] += sums[2 * b]
            total[b, 2 * j + 1] += sums[2 * b + 1]


@numba.njit(cache=True, fastmath={"nsz", "contract", "reassoc"})
def _add_jumps(i, rho, row, j_ptr, j_col, j_val, e_row, e_col, e_val, e_ptr):  # pragma: no cover
    dimension = rho.shape[0]
    for k in range(e_ptr.size - 1):
        for position in range(j_ptr[k * dimension + i], j_ptr[k * dimension + i + 1]):
            value = j_val[position]
            other = rho[j_col[position]]
            for entry in range(e_ptr[k], e_ptr[k + 1]):
                row[e_row[entry]] += value * e_val[entry] * other[e_col[entry]]


@numba.njit(parallel=True, cache=True, fastmath={"nsz", "contract", "reassoc"})
def _apply(
    rho,
    doubles,
    out,
    x_ptr,
    x_col,
    x_val,
    y_ptr,
    y_col,
    y_val,
    weights,
    j_ptr,
    j_col,
    j_val,
    e_row,
    e_col,
    e_val,
    e_ptr,
):  # pragma: no cover
    dimension = rho.shape[0]
    for block in numba.prange((dimension + TILE - 1) // TILE):
        first = block * TILE
        height = min(TILE, dimension - first)
        tile = np.zeros((dimension, 2 * TILE))
        for b in range(height):
            for j in range(dimension):
                tile[j, 2 * b] = doubles[first + b, 2 * j]
                tile[j, 2 * b + 1] = doubles[first + b, 2 * j + 1]
        turned = np.zeros((height, 2 * dimension))
        mixed = x_val.size > 0
        straight = np.zeros((height if mixed else 1, 2 * dimension))
        for b in range(height):
            _add_rows(first + b, doubles, y_ptr, y_col, y_val, turned[b])
        _add_columns(tile, y_ptr, y_col, y_val, -1.0, turned)
        if mixed:
            for b in range(height):
                _add_rows(first + b, doubles, x_ptr, x_col, x_val, straight[b])
            _add_columns(tile, x_ptr, x_col, x_val, 1.0, straight)
        for b in range(height):
            i = first + b
            for j in range(dimension):
                rotated = complex(-turned[b, 2 * j + 1], turned[b, 2 * j])
                out[i, j] = weights[i, j] * rho[i, j] + rotated
            if mixed:
                for j in range(dimension):
                    out[i, j] += complex(straight[b, 2 * j], straight[b, 2 * j + 1])
            _add_jumps(i, rho, out[i], j_ptr, j_col, j_val, e_row, e_col, e_val, e_ptr)


def apply_tables(
    tables: ActionTables, rho: np.ndarray, out: np.ndarray | None = None
) -> np.ndarray:
    """``A rho + rho A^dag + sum l rho l^dag``; ``rho`` and the result are complex128 (D, D)."""
    rho = np.ascontiguousarray(rho, dtype=np.complex128)
    if out is None:
        out = np.empty_like(rho)
    _apply(
        rho,
        rho.view(np.float64),
        out,
        *tables.real,
        *tables.imaginary,
        tables.weights,
        *tables.jumps,
        *tables.entries,
        tables.entry_pointers,
    )
    return out
