"""Sparse families of operators: coefficients over strings, one column per operator.

Local maps act without listing strings that are absent, so that the cost follows the number of
coefficients and not the number of strings that exist.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sparse

from lbwork.integrability.commutators import canonical_codes, string_ranges
from lbwork.integrability.strings import CommutatorTable

__all__ = ["StringVectors", "commuted", "joined"]

_ROUNDING = 1e-15


@dataclass(frozen=True, eq=False)
class StringVectors:
    """Columns of coefficients: ``codes`` int64 sorted (N,), over ``width`` sites of ``base``
    operators; ``values`` complex csr (N, columns).
    """

    base: int
    width: int
    codes: np.ndarray
    values: sparse.csr_matrix

    @classmethod
    def summed(
        cls,
        base: int,
        width: int,
        codes: np.ndarray,
        columns: np.ndarray,
        values: np.ndarray,
        count: int,
    ) -> StringVectors:
        """Coefficients in any order, equal places added up, rounding errors left out."""
        unique, inverse = np.unique(codes, return_inverse=True)
        matrix = sparse.coo_matrix(
            (values, (inverse, columns)), shape=(unique.size, count), dtype=complex
        ).tocsr()
        largest = float(np.abs(values).max(initial=0.0))
        matrix.data[np.abs(matrix.data) <= _ROUNDING * largest] = 0
        matrix.eliminate_zeros()
        kept = np.diff(matrix.indptr) > 0
        return cls(base, width, unique[kept], matrix[kept])

    @property
    def columns(self) -> int:
        """Number of operators."""
        return int(self.values.shape[1])

    @property
    def norms(self) -> np.ndarray:
        """Euclidean norm of each column, float64 (columns,)."""
        return np.sqrt(np.asarray(abs(self.values).power(2).sum(axis=0)).ravel())

    def acted(self, matrix: sparse.csr_matrix, place: int, taken: int, given: int) -> StringVectors:
        """Apply a local map (base**given, base**taken) to ``taken`` sites from ``place`` on."""
        base = self.base
        unit = base ** (self.width - place - taken)
        inner = (self.codes // unit) % base**taken
        outer = self.codes // (unit * base**taken) * unit + self.codes % unit
        rest, where = np.unique(outer, return_inverse=True)
        entries = self.values.tocoo()
        wide = sparse.csr_matrix(
            (entries.data, (inner[entries.row], where[entries.row] * self.columns + entries.col)),
            shape=(base**taken, max(rest.size * self.columns, 1)),
        )
        result = (matrix @ wide).tocoo()
        index, column = np.divmod(result.col.astype(np.int64), max(self.columns, 1))
        outside = rest[index] if rest.size else index
        codes = (outside // unit * base**given + result.row) * unit + outside % unit
        return StringVectors.summed(
            base, self.width - taken + given, codes, column, result.data, self.columns
        )

    def times(self, matrix: sparse.csr_matrix | np.ndarray) -> StringVectors:
        """New columns as combinations of the old ones: matrix (columns, new columns)."""
        entries = sparse.coo_matrix(self.values @ sparse.csr_matrix(matrix))
        return StringVectors.summed(
            self.base,
            self.width,
            self.codes[entries.row],
            entries.col,
            entries.data,
            matrix.shape[1],
        )

    def widened(self, width: int) -> StringVectors:
        """The same operators over more sites, identities added on the right."""
        codes = self.codes * self.base ** (width - self.width)
        return StringVectors(self.base, width, codes, self.values)

    def of_range(self, length: int) -> StringVectors:
        """The strings of exactly this range, over as many sites; canonical strings only."""
        kept = string_ranges(self.codes, self.base, self.width) == length
        codes = self.codes[kept] // self.base ** (self.width - length)
        return StringVectors(self.base, length, codes, self.values[kept])

    def dense(self, codes: np.ndarray) -> np.ndarray:
        """Complex (codes, columns) at the given sorted codes; others are left out."""
        result = np.zeros((codes.size, self.columns), dtype=complex)
        if codes.size:
            place = np.minimum(np.searchsorted(codes, self.codes), codes.size - 1)
            known = codes[place] == self.codes
            result[place[known]] = self.values[known].toarray()
        return result


def joined(parts: list[StringVectors], factors: list[float] | None = None) -> StringVectors:
    """Sum of families of equal width, number of columns, and base."""
    first = parts[0]
    weights = factors or [1.0] * len(parts)
    entries = [part.values.tocoo() for part in parts]
    return StringVectors.summed(
        first.base,
        first.width,
        np.concatenate([part.codes[e.row] for part, e in zip(parts, entries, strict=True)]),
        np.concatenate([e.col for e in entries]),
        np.concatenate([w * e.data for w, e in zip(weights, entries, strict=True)]),
        first.columns,
    )


def commuted(table: CommutatorTable, vectors: StringVectors) -> StringVectors:
    """Canonical form of ``[sum_j q_j, A]`` over ``width + 1`` sites for each column A."""
    base, width = vectors.base, vectors.width
    window = StringVectors(base, width + 2, vectors.codes * base, vectors.values)
    matrix = table.matrix.tocsr()
    total = joined([window.acted(matrix, place, 2, 2) for place in range(width + 1)])
    entries = total.values.tocoo()
    codes = canonical_codes(total.codes, base, width + 2) // base
    return StringVectors.summed(
        base, width + 1, codes[entries.row], entries.col, entries.data, vectors.columns
    )
