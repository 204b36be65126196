"""Matrix-free application of a generator to a density matrix, threads over tiles.

``L(rho) = A rho + rho A^dag + sum_k l_k rho l_k^dag`` with sparse ``A`` and ``l_k`` of dimension
``D = d**L`` (rates absorbed). Everything diagonal is one factor per element,
``W_ij = A_ii + A_jj* + sum_k l_k(i) l_k(j)*``, kept as one D x D array (real where possible). The
left product works on tiles of a few columns, the right product on transposed tiles of a few rows;
tiles hold real and imaginary parts apart, so that one scalar multiplies a whole vector register.
Besides input and output only W, tiles and D x D-sparse operators are held, never a matrix of
dimension ``D**2``.
"""

from __future__ import annotations

from dataclasses import dataclass

import numba
import numpy as np
import scipy.sparse as sparse

__all__ = ["ActionTables", "action_tables", "apply_tables"]


TILE = 8


@dataclass(frozen=True, eq=False)
class ActionTables:
    """Flat arrays that the compiled kernel reads.

    ``left``: csr arrays of A without its diagonal, real and imaginary parts of the values apart;
    ``imaginary``: whether all real parts are zero (real H); ``weights``: W, float64 or complex128 (D, D);
    ``jumps``: csr arrays of the off-diagonal jumps, stacked; ``entries``: the same jumps as (row,
    column, conjugated value) lists with ``entry_pointers`` (K + 1,).
    """

    dimension: int
    left: tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]
    imaginary: bool
    weights: np.ndarray
    jumps: tuple[np.ndarray, np.ndarray, np.ndarray]
    entries: tuple[np.ndarray, np.ndarray, np.ndarray]
    entry_pointers: np.ndarray


def _csr_arrays(matrix: sparse.csr_matrix) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    return (
        matrix.indptr.astype(np.int64),
        matrix.indices.astype(np.int32),
        np.ascontiguousarray(matrix.data, dtype=np.complex128),
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
        np.concatenate([item.data.conj() for item in lists] or [np.zeros(0)]).astype(complex),
    )
    pointers = np.cumsum([0, *(item.nnz for item in lists)]).astype(np.int64)
    weights = _weights(diagonal, factors)
    pointer, column, value = _csr_arrays(left)
    return ActionTables(
        dimension,
        (pointer, column, value.real.copy(), value.imag.copy()),
        bool(np.all(value.real == 0)),
        weights,
        _csr_arrays(stacked),
        joined,
        pointers,
    )


@numba.njit(cache=True, fastmath={"nsz", "contract", "reassoc"})
def _times_tile(pointer, column, real, imag, sign, imaginary, source, target):  # pragma: no cover
    """``target = M source`` for tiles (2, D, TILE); ``sign`` -1 conjugates the matrix."""
    for j in range(source.shape[1]):
        for b in range(TILE):
            target[0, j, b] = 0.0
            target[1, j, b] = 0.0
        for position in range(pointer[j], pointer[j + 1]):
            other = column[position]
            y = sign * imag[position]
            for b in range(TILE):
                target[0, j, b] -= y * source[1, other, b]
                target[1, j, b] += y * source[0, other, b]
            if not imaginary:
                x = real[position]
                for b in range(TILE):
                    target[0, j, b] += x * source[0, other, b]
                    target[1, j, b] += x * source[1, other, b]


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
def _left(rho, out, pointer, column, real, imag, imaginary):  # pragma: no cover
    dimension = rho.shape[0]
    for block in numba.prange((dimension + TILE - 1) // TILE):
        first = block * TILE
        width = min(TILE, dimension - first)
        source = np.zeros((2, dimension, TILE))
        target = np.empty((2, dimension, TILE))
        for i in range(dimension):
            for b in range(width):
                source[0, i, b] = rho[i, first + b].real
                source[1, i, b] = rho[i, first + b].imag
        _times_tile(pointer, column, real, imag, 1.0, imaginary, source, target)
        for i in range(dimension):
            for b in range(width):
                out[i, first + b] = complex(target[0, i, b], target[1, i, b])


@numba.njit(parallel=True, cache=True, fastmath={"nsz", "contract", "reassoc"})
def _right(
    rho,
    out,
    pointer,
    column,
    real,
    imag,
    imaginary,
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
        source = np.zeros((2, dimension, TILE))
        target = np.empty((2, dimension, TILE))
        for j in range(dimension):
            for b in range(height):
                source[0, j, b] = rho[first + b, j].real
                source[1, j, b] = rho[first + b, j].imag
        _times_tile(pointer, column, real, imag, -1.0, imaginary, source, target)
        for j in range(dimension):
            for b in range(height):
                i = first + b
                out[i, j] += weights[i, j] * rho[i, j] + complex(target[0, j, b], target[1, j, b])
        for b in range(height):
            i = first + b
            _add_jumps(i, rho, out[i], j_ptr, j_col, j_val, e_row, e_col, e_val, e_ptr)


def apply_tables(
    tables: ActionTables, rho: np.ndarray, out: np.ndarray | None = None
) -> np.ndarray:
    """``A rho + rho A^dag + sum l rho l^dag``; ``rho`` and the result are complex128 (D, D)."""
    rho = np.ascontiguousarray(rho, dtype=np.complex128)
    if out is None:
        out = np.empty_like(rho)
    _left(rho, out, *tables.left, tables.imaginary)
    _right(
        rho,
        out,
        *tables.left,
        tables.imaginary,
        tables.weights,
        *tables.jumps,
        *tables.entries,
        tables.entry_pointers,
    )
    return out
