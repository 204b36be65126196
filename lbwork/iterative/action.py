"""The generator on the vectors of one sector, matrix-free."""

from __future__ import annotations

import numpy as np
import scipy.sparse as sparse
from scipy.sparse.csgraph import connected_components

from lbwork import defaults
from lbwork.errors import SymmetryError
from lbwork.iterative.kernels import (
    add_sandwiches,
    apply_complex,
    apply_real,
    subtract_transposed,
)
from lbwork.iterative.local_form import LocalForm
from lbwork.iterative.sandwiches import LocalTerm, Sandwiches, elementwise, rows_of, sandwiches
from lbwork.iterative.space import SectorSpace

__all__ = ["LocalMap", "SectorGenerator", "sorted_operator"]

_NOTHING = np.zeros(0)


def sorted_operator(matrix: sparse.csr_matrix, space: SectorSpace) -> sparse.csr_matrix:
    """An operator csr (D, D) with kets in the order of the groups.

    Raises SymmetryError when it joins two groups.
    """
    order = space.groups.order
    moved = matrix.tocsr()[order][:, order].tocoo()
    group = space.groups.group_of
    joining = group[moved.row] != group[moved.col]
    if np.any(joining):
        size = np.abs(moved.data)
        if size[joining].max() > defaults.SYMMETRY_TOLERANCE * size.max():
            raise SymmetryError("the Hamiltonian joins two charge groups; the charges do not hold")
        # Rounding of a rotated basis.
        moved.data[joining] = 0
    result = moved.tocsr()
    result.eliminate_zeros()
    result.sort_indices()
    return result


def _csr(matrix: sparse.csr_matrix, kind: type) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    kept = matrix.copy()
    kept.setdiag(0)
    kept.eliminate_zeros()
    return kept.indptr.astype(np.int64), kept.indices.astype(np.int64), kept.data.astype(kind)


class LocalMap:
    """A sum of local superoperators that preserves Hermiticity, on vectors of one sector."""

    def __init__(self, space: SectorSpace, terms: list[LocalTerm], form: LocalForm) -> None:
        self._space = space
        self._rows = rows_of(space)
        self._parts: list[tuple[np.ndarray | None, Sandwiches, bool]] = []
        count, dimension = form.sites, form.dimension
        pieces: list[tuple[list[LocalTerm], bool]] = [(terms, False)]
        if space.hermitian:
            pieces = [
                ([(sites, tensor.real.copy()) for sites, tensor in terms], False),
                ([(sites, tensor.imag.copy()) for sites, tensor in terms], True),
            ]
        for group, turned in pieces:
            table = elementwise(space, group, count, dimension)
            lists = sandwiches(space, self._rows, group, count, dimension)
            if table is not None or not lists.empty:
                self._parts.append((table, lists, turned))

    def joined(self) -> list[tuple[np.ndarray, np.ndarray]]:
        """Row pointers and source rows of each part: which rows feed which."""
        return [(lists.pointer, lists.source) for _, lists, _ in self._parts]

    def take_table(self) -> np.ndarray | None:
        """Remove and return the weights of the elementwise part that is not turned."""
        for index, (table, lists, turned) in enumerate(self._parts):
            if not turned and table is not None:
                self._parts[index] = (None, lists, turned)
                return table
        return None

    def apply(self, vector: np.ndarray) -> np.ndarray:
        """The image of a vector."""
        result = np.zeros(vector.size, dtype=vector.dtype)
        for table, lists, turned in self._parts:
            image = np.zeros_like(result) if turned else result
            if table is not None:
                np.multiply(table, vector, out=image)
            if not lists.empty:
                add_sandwiches(vector, image, self._rows.start, self._rows.length, *lists.arrays())
            if turned:
                _subtract(self._space, result, image)
        return result


def _subtract(space: SectorSpace, result: np.ndarray, turned: np.ndarray) -> None:
    for offset, (size, _) in zip(space.offsets[:-1], space.shapes, strict=True):
        subtract_transposed(result, turned, offset, size)


class SectorGenerator:
    """``L`` on the vectors of one sector: ``A X + X A^dag`` and all jumps, with ``A = -i Heff``."""

    def __init__(self, space: SectorSpace, form: LocalForm) -> None:
        self.space = space
        self._rows = rows_of(space)
        no_jump = sorted_operator(form.no_jump, space)
        diagonal = no_jump.diagonal()
        terms: list[LocalTerm] = [(jump.sites, jump.superoperator) for jump in form.jumps]
        rows = self._rows
        self._shape = (rows.ket, rows.start, rows.length, rows.first_bra, rows.of_ket)
        self._turned_jumps: LocalMap | None = None
        self._joined: list[tuple[np.ndarray, np.ndarray]] = []
        count, dimension = form.sites, form.dimension
        if space.hermitian:
            real = [(sites, tensor.real.copy()) for sites, tensor in terms]
            table = elementwise(space, real, count, dimension)
            lists = sandwiches(space, rows, real, count, dimension)
            self._tables: tuple[np.ndarray, ...] = (
                np.ascontiguousarray(diagonal.real),
                *_csr(no_jump.real.tocsr(), np.float64),
                np.ascontiguousarray(diagonal.imag),
                *_csr(no_jump.imag.tocsr(), np.float64),
                _NOTHING if table is None else table,
                *lists.arrays(),
            )
            imaginary = [(sites, 1j * tensor.imag) for sites, tensor in terms if tensor.imag.any()]
            if imaginary:
                self._turned_jumps = LocalMap(space, imaginary, form)
                self._joined += self._turned_jumps.joined()
        else:
            pointer, column, values = _csr(no_jump, np.complex128)
            table = elementwise(space, terms, count, dimension)
            lists = sandwiches(space, rows, terms, count, dimension)
            self._tables = (
                diagonal.astype(complex),
                pointer,
                column,
                values,
                values.conj(),
                _NOTHING.astype(complex) if table is None else table,
                *lists.arrays(),
            )
        self._joined.append((lists.pointer, lists.source))

    def components(self) -> list[list[int]]:
        """Blocks of the sector that the jumps join, as lists of block numbers."""
        blocks = len(self.space.pairs)
        links = sparse.csr_matrix((blocks, blocks))
        for pointer, source in self._joined:
            into = np.repeat(self._rows.pair, np.diff(pointer))
            ones = np.ones(source.size)
            links = links + sparse.csr_matrix(
                (ones, (into, self._rows.pair[source])), shape=(blocks, blocks)
            )
        count, label = connected_components(links, directed=False)
        return [
            [int(index) for index in np.flatnonzero(label == number)] for number in range(count)
        ]

    def apply(self, vector: np.ndarray) -> np.ndarray:
        """``L`` on a contiguous vector of the sector's type."""
        result = np.empty_like(vector)
        if not self.space.hermitian:
            apply_complex(vector, result, *self._shape, *self._tables)
            return result
        turned = np.empty_like(result)
        apply_real(vector, result, turned, *self._shape, *self._tables)
        _subtract(self.space, result, turned)
        if self._turned_jumps is not None:
            result += self._turned_jumps.apply(vector)
        return result
