"""Operators on a few neighbouring sites as coefficients of strings of on-site operators.

The on-site operators ``e_0 = 1, e_1, ..., e_(n^2 - 1)`` are orthonormal in ``tr(a^dag b)/n``: the
identity, traceless diagonal matrices and ``sqrt(d)`` times matrix units. On a doubled site they are
products of one for the ket and one for the bra, so that every string has a definite weight under
every diagonal on-site charge, and what acts on the ket alone is seen at once. A string of ``w``
sites has the code ``sum_j s_j (n^2)^(w - 1 - j)``: base ``n^2``, first site most significant.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
import scipy.sparse as sparse

__all__ = ["CommutatorTable", "StringBasis", "commutator_table", "string_basis"]


def _single_site(dimension: int) -> tuple[list[str], np.ndarray, np.ndarray]:
    """Names, orthonormal matrices (d**2, d, d), and factors that turn them into the named ones."""
    names, matrices, factors = ["I"], [np.eye(dimension)], [1.0]
    for level in range(1, dimension):
        # Helmert matrices: level states up, one down.
        diagonal = np.zeros(dimension)
        diagonal[:level] = 1
        diagonal[level] = -level
        scale = np.sqrt(dimension / (level * (level + 1)))
        names.append("Z" if dimension == 2 else f"D{level}")
        matrices.append(np.diag(scale * diagonal))
        factors.append(1 / scale)
    for distance in range(1, dimension):
        for low in range(dimension - distance):
            for row, column in ((low, low + distance), (low + distance, low)):
                unit = np.zeros((dimension, dimension))
                unit[row, column] = np.sqrt(dimension)
                if dimension == 2:
                    names.append("S+" if row == 0 else "S-")
                else:
                    names.append(f"E{row + 1}{column + 1}")
                matrices.append(unit)
                factors.append(1 / np.sqrt(dimension))
    return names, np.array(matrices), np.array(factors)


@dataclass(frozen=True, eq=False)
class StringBasis:
    """On-site operators of a site with ``dimension`` n states.

    ``matrices``: real (n**2, n, n), orthonormal, the identity first. ``names``: printable;
    ``ket:bra`` on a doubled site. ``factors``: float64 (n**2,), named operator = factor * matrix.
    ``sides``: int8 (n**2,), 0 identity, 1 ket only, 2 bra only, 3 both or undivided.
    """

    dimension: int
    doubled: bool
    names: tuple[str, ...]
    matrices: np.ndarray
    factors: np.ndarray
    sides: np.ndarray

    @property
    def size(self) -> int:
        """Number of on-site operators, n**2."""
        return self.dimension**2

    def coefficients(self, matrix: np.ndarray) -> np.ndarray:
        """Tensor (n**2,) * w of a (n**w, n**w) matrix: ``tr(string^dag matrix) / n**w``."""
        n = self.dimension
        count = round(np.log(matrix.shape[0]) / np.log(n))
        order = [axis for site in range(count) for axis in (site, count + site)]
        tensor = matrix.reshape((n,) * (2 * count)).transpose(order).reshape((n * n,) * count)
        change = self.matrices.reshape(n * n, n * n) / n
        for _ in range(count):
            # Contracting the first axis moves it to the end; after all sites the order is back.
            tensor = np.tensordot(tensor, change, axes=([0], [1]))
        return np.asarray(tensor)

    def matrix(self, coefficients: np.ndarray) -> np.ndarray:
        """Inverse of :meth:`coefficients`: complex (n**w, n**w)."""
        n = self.dimension
        count = coefficients.ndim
        change = self.matrices.reshape(n * n, n * n)
        tensor = coefficients
        for _ in range(count):
            tensor = np.tensordot(tensor, change, axes=([0], [0]))
        tensor = tensor.reshape((n,) * (2 * count))
        order = [*range(0, 2 * count, 2), *range(1, 2 * count, 2)]
        return np.ascontiguousarray(tensor.transpose(order)).reshape(n**count, n**count)

    def word(self, digits: np.ndarray) -> str:
        """A string in words, trailing identities left out, e.g. ``S+:I S-:I``."""
        last = int(np.max(np.flatnonzero(digits), initial=0))
        return " ".join(self.names[digit] for digit in digits[: last + 1])


@lru_cache(maxsize=8)
def string_basis(dimension: int, doubled: bool) -> StringBasis:
    """The operators on a site of n = ``dimension`` states; doubled: ket times bra."""
    if not doubled:
        names, matrices, factors = _single_site(dimension)
        sides = np.full(dimension**2, 3, dtype=np.int8)
        sides[0] = 0
        return StringBasis(dimension, False, tuple(names), matrices, factors, sides)
    names, matrices, factors = _single_site(round(np.sqrt(dimension)))
    pairs = [(ket, bra) for ket in range(len(names)) for bra in range(len(names))]
    return StringBasis(
        dimension,
        True,
        tuple(f"{names[ket]}:{names[bra]}" if ket or bra else "I" for ket, bra in pairs),
        np.array([np.kron(matrices[ket], matrices[bra]) for ket, bra in pairs]),
        np.array([factors[ket] * factors[bra] for ket, bra in pairs]),
        np.array([(ket > 0) + 2 * (bra > 0) for ket, bra in pairs], dtype=np.int8),
    )


@dataclass(frozen=True, eq=False)
class CommutatorTable:
    """``X -> [q, X]`` on two sites: ``matrix`` csc (n**4, n**4) over codes, ``base`` n**2."""

    base: int
    matrix: sparse.csc_matrix


def _site_products(basis: StringBasis) -> tuple[list[sparse.csr_matrix], list[sparse.csr_matrix]]:
    """Left and right multiplication by each on-site operator, csr (n**2, n**2) each."""
    n, size = basis.dimension, basis.size
    change = sparse.csr_matrix(basis.matrices.reshape(size, n * n))
    one = sparse.identity(n, format="csr")
    lefts, rights = [], []
    for matrix in basis.matrices:
        unit = sparse.csr_matrix(matrix)
        lefts.append((change @ sparse.kron(unit, one) @ change.T / n).tocsr())
        rights.append((change @ sparse.kron(one, unit.T) @ change.T / n).tocsr())
    return lefts, rights


def commutator_table(basis: StringBasis, coefficients: np.ndarray) -> CommutatorTable:
    """Table of ``X -> [q, X]`` on two sites for q with string coefficients (n**2, n**2)."""
    lefts, rights = _site_products(basis)
    size = basis.size
    total = sparse.csr_matrix((size**2, size**2), dtype=complex)
    for first in range(size):
        row = coefficients[first]
        present = np.flatnonzero(row)
        if present.size == 0:
            continue
        left = sum(row[second] * lefts[second] for second in present)
        right = sum(row[second] * rights[second] for second in present)
        total = total + sparse.kron(lefts[first], left) - sparse.kron(rights[first], right)
    matrix = total.tocsc()
    # Cancelled products leave rounding errors behind that would pass for entries.
    scale = float(np.abs(coefficients).max(initial=0.0))
    matrix.data[np.abs(matrix.data) < 1e-14 * size * scale] = 0
    matrix.eliminate_zeros()
    matrix.sort_indices()
    return CommutatorTable(size, matrix)
