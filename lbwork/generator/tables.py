"""The flat arrays behind the matrix-free action of a generator.

Operators that act from the left are kept as CSR rows. Operators that act from the right are kept as
*runs*: ``M[r + t, c + t] = value`` for ``0 <= t < length``. A local operator on a chain is a few
long runs, since the sites right of its support do not change; adding ``row M^T`` is then the
addition of contiguous pieces. Equal neighbouring values make runs long, and nothing else depends
on them.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sparse

from lbwork.errors import CapacityError
from lbwork.provenance import usable_memory

__all__ = ["ActionTables", "Rows", "Runs", "action_tables", "runs_of"]


@dataclass(frozen=True, eq=False)
class Rows:
    """CSR arrays: ``pointers`` int64, ``columns`` int32, ``values`` float64 or complex128."""

    pointers: np.ndarray
    columns: np.ndarray
    values: np.ndarray

    @classmethod
    def of(cls, matrix: sparse.csr_matrix, kind: type) -> Rows:
        """The non-zeros of a csr matrix, with values of the numeric type ``kind``."""
        kept = matrix.copy()
        kept.eliminate_zeros()
        return cls(
            kept.indptr.astype(np.int64), kept.indices.astype(np.int32), kept.data.astype(kind)
        )


@dataclass(frozen=True, eq=False)
class Runs:
    """The runs of several operators, for each operator those of length one first.

    ``places``: uint32 (N, 3), first row, first column and length, all doubled: they count the
    doubles of a complex row. ``values``: float64 or complex128 (N,). ``bounds``: int64
    (operators, 3), where the runs of an operator begin, where those longer than one begin, and
    where they end.
    """

    places: np.ndarray
    values: np.ndarray
    bounds: np.ndarray


@dataclass(frozen=True, eq=False)
class ActionTables:
    """``A = diag(a) + x + i y`` and jumps, of dimension D, as the compiled kernel reads them.

    ``diagonal``: a, complex128 (D,). ``real``, ``imaginary``: x and y. ``jumps``: the off-diagonal
    jumps stacked to (K D, D). ``part_runs``: of x and y, real. ``jump_runs``: of the complex
    conjugates of these jumps, complex.
    ``factor_real``, ``factor_imaginary``: ``G_ij = sum_k l_k(i) l_k(j)*`` over the diagonal jumps,
    float64 (D, D), or (D, 0) where it vanishes.
    """

    diagonal: np.ndarray
    real: Rows
    imaginary: Rows
    jumps: Rows
    part_runs: Runs
    jump_runs: Runs
    factor_real: np.ndarray
    factor_imaginary: np.ndarray

    def arrays(self) -> tuple[np.ndarray, ...]:
        """All arrays in the order of the kernel's arguments."""
        rows = [
            array
            for group in (self.real, self.imaginary, self.jumps)
            for array in (group.pointers, group.columns, group.values)
        ]
        runs = [
            array
            for group in (self.part_runs, self.jump_runs)
            for array in (group.places, group.values, group.bounds)
        ]
        return (self.diagonal, *rows, *runs, self.factor_real, self.factor_imaginary)

    @property
    def nbytes(self) -> int:
        """Bytes held."""
        return sum(array.nbytes for array in self.arrays())


def runs_of(matrices: Sequence[sparse.spmatrix], kind: type) -> Runs:
    """Split sparse matrices into runs of equal values along diagonals, of numeric type ``kind``."""
    places, values, bounds = [np.zeros((0, 3))], [np.zeros(0)], []
    begin = 0
    for matrix in matrices:
        entries = matrix.tocoo()
        order = np.lexsort((entries.row, entries.col - entries.row))
        row, column, value = entries.row[order], entries.col[order], entries.data[order]
        first = np.ones(row.size, dtype=bool)
        first[1:] = (np.diff(row) != 1) | (np.diff(column) != 1) | (value[1:] != value[:-1])
        starts = np.flatnonzero(first)
        lengths = np.diff(np.append(starts, row.size))
        short_first = np.argsort(lengths, kind="stable")
        starts, lengths = starts[short_first], lengths[short_first]
        places.append(2 * np.stack([row[starts], column[starts], lengths], axis=1))
        values.append(value[starts])
        end = begin + lengths.size
        bounds.append((begin, begin + np.count_nonzero(lengths == 1), end))
        begin = end
    return Runs(
        np.concatenate(places).astype(np.uint32),
        np.concatenate(values).astype(kind),
        np.array(bounds, dtype=np.int64).reshape(-1, 3),
    )


def _factor_tables(factors: list[np.ndarray], dimension: int) -> tuple[np.ndarray, np.ndarray]:
    """Real and imaginary part of G, each as one product so that no second D x D array is made."""
    table = np.array(factors, dtype=complex).reshape(len(factors), dimension)
    complex_valued = bool(np.any(table.imag))
    needed = 8 * dimension**2 * (bool(factors) + complex_valued)
    if needed > usable_memory():
        raise CapacityError(
            f"the diagonal jumps need a table of {needed / 2**30:.1f} GiB for operators of "
            f"dimension {dimension}, {usable_memory() / 2**30:.1f} GiB can be used; use fewer sites"
        )
    nothing = np.zeros((dimension, 0))
    both = np.concatenate([table.real, table.imag])
    crossed = np.concatenate([table.imag, -table.real])
    return (
        both.T @ both if factors else nothing,
        crossed.T @ both if complex_valued else nothing,
    )


def action_tables(a: sparse.csr_matrix, jumps: Sequence[sparse.csr_matrix]) -> ActionTables:
    """Prepare the tables of ``rho -> A rho + rho A^dag + sum_k l_k rho l_k^dag``.

    ``a`` and the ``jumps`` (rates absorbed) are csr (D, D). Raises CapacityError when the D x D
    table of the diagonal jumps does not fit in memory.
    """
    dimension = a.shape[0]
    diagonal = np.ascontiguousarray(a.diagonal(), dtype=np.complex128)
    rest = (a - sparse.diags_array(diagonal, format="csr")).tocsr()
    rest.eliminate_zeros()
    factors, others = [], []
    for jump in jumps:
        values = jump.diagonal()
        if jump.nnz == np.count_nonzero(values):
            factors.append(values)
        else:
            others.append(jump.tocsr())
    empty = sparse.csr_matrix((0, dimension), dtype=complex)
    stacked = sparse.vstack(others, format="csr") if others else empty
    real, imaginary = rest.real.tocsr(), rest.imag.tocsr()
    for part in (real, imaginary):
        part.eliminate_zeros()
    return ActionTables(
        diagonal,
        Rows.of(real, np.float64),
        Rows.of(imaginary, np.float64),
        Rows.of(stacked, np.complex128),
        runs_of([real, imaginary], np.float64),
        runs_of([jump.conj() for jump in others], np.complex128),
        *_factor_tables(factors, dimension),
    )
