"""Matrix-free application of a generator to a density matrix, threads over rows.

``L(rho) = A rho + rho A^dag + sum_k l_k rho l_k^dag`` with sparse ``A`` and ``l_k`` of dimension
``D = d**L`` (rates absorbed). One output row is made at a time: the left product adds scaled rows,
the right product gathers within the finished row. Diagonal jumps are folded into one factor per
element, ``sum_k l_k(i) l_k(j)*``. Besides input and output only row buffers and D x D-sparse
operators are held, never a matrix of dimension ``D**2``.
"""

from __future__ import annotations

from dataclasses import dataclass

import numba
import numpy as np
import scipy.sparse as sparse

__all__ = ["ActionTables", "action_tables", "apply_tables"]


@dataclass(frozen=True, eq=False)
class ActionTables:
    """Flat arrays that the compiled kernel reads.

    ``left``: csr arrays of A without its diagonal; ``diagonal``: diagonal of A, complex (D,);
    ``factors``: diagonal jumps, complex (K, D); ``jumps``: csr arrays of the other jumps, stacked.
    """

    dimension: int
    left: tuple[np.ndarray, np.ndarray, np.ndarray]
    diagonal: np.ndarray
    factors: np.ndarray
    jumps: tuple[np.ndarray, np.ndarray, np.ndarray]
    jump_count: int


def _csr_arrays(matrix: sparse.csr_matrix) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    return (
        matrix.indptr.astype(np.int64),
        matrix.indices.astype(np.int32),
        np.ascontiguousarray(matrix.data, dtype=np.complex128),
    )


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
    stacked = (
        sparse.vstack(others, format="csr")
        if others
        else sparse.csr_matrix((0, dimension), dtype=complex)
    )
    return ActionTables(
        dimension,
        _csr_arrays(left),
        diagonal,
        np.array(factors, dtype=np.complex128).reshape(len(factors), dimension),
        _csr_arrays(stacked),
        len(others),
    )


@numba.njit(parallel=True, cache=True, fastmath={"nsz", "contract", "reassoc"})
def _apply(rho, out, a_ptr, a_col, a_val, diagonal, factors, j_ptr, j_col, j_val, jump_count):
    dimension = rho.shape[0]
    for i in numba.prange(dimension):
        row = np.empty(dimension, dtype=np.complex128)
        source = rho[i]
        own = diagonal[i]
        for j in range(dimension):
            row[j] = (own + diagonal[j].conjugate()) * source[j]
        for k in range(factors.shape[0]):
            weight = factors[k, i]
            for j in range(dimension):
                row[j] += weight * factors[k, j].conjugate() * source[j]
        for position in range(a_ptr[i], a_ptr[i + 1]):
            value = a_val[position]
            other = rho[a_col[position]]
            for j in range(dimension):
                row[j] += value * other[j]
        for j in range(dimension):
            total = 0j
            for position in range(a_ptr[j], a_ptr[j + 1]):
                total += a_val[position].conjugate() * source[a_col[position]]
            row[j] += total
        if jump_count:
            moved = np.empty(dimension, dtype=np.complex128)
            for k in range(jump_count):
                start = k * dimension
                first, last = j_ptr[start + i], j_ptr[start + i + 1]
                if first == last:
                    continue
                moved[:] = 0
                for position in range(first, last):
                    value = j_val[position]
                    other = rho[j_col[position]]
                    for j in range(dimension):
                        moved[j] += value * other[j]
                for j in range(dimension):
                    for position in range(j_ptr[start + j], j_ptr[start + j + 1]):
                        row[j] += j_val[position].conjugate() * moved[j_col[position]]
        out[i] = row


def apply_tables(tables: ActionTables, rho: np.ndarray, out: np.ndarray | None = None) -> np.ndarray:
    """``A rho + rho A^dag + sum l rho l^dag``; ``rho`` and the result are complex128 (D, D)."""
    rho = np.ascontiguousarray(rho, dtype=np.complex128)
    if out is None:
        out = np.empty_like(rho)
    _apply(
        rho, out, *tables.left, tables.diagonal, tables.factors, *tables.jumps, tables.jump_count
    )
    return out
