"""Charges from their leading parts, for densities that spread every operator.

Split ``q = M + fields`` with M traceless on both sites, and a charge of range r into its parts
``a_k`` on exactly k sites. The strings of k + 1 sites in ``[Q, sum a]`` get contributions from
``a_k`` through the ends alone: ``T a_k = lambda a_k + rho a_k``, where lambda and rho commute the
first (last) site with M and so add a site on the left (right). If both are injective, every
equation ``T a_k = y`` with k > 2 reduces to one with k - 1: the part of a_k outside the image of
lambda is read off with the inverse of rho, the rest is ``lambda b`` and b obeys ``T b = y'``. What
remains are least squares on two sites, and a handful of free parameters: the solutions of
``T b = 0`` on two sites at each range, and the one-site operators. Conditions that y must satisfy
on the way are collected; the charges are the parameters that satisfy them all.

That leading parts are nested commutators of M is the idea behind proofs of absence of charges
(N. Shiraishi, Europhys. Lett. 128, 17002 (2019); A. Hokkyo, arXiv:2501.18400; from memory).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sparse

from lbwork import defaults
from lbwork.integrability.density import LocalDensity
from lbwork.integrability.elimination import NullSpace
from lbwork.integrability.least_squares import Factored, factored
from lbwork.integrability.string_vectors import StringVectors, commuted, joined
from lbwork.integrability.strings import CommutatorTable

__all__ = ["EndMaps", "charges_from_leading_parts", "end_maps"]

_INJECTIVE = 0.02
"""Smallest over largest singular value of lambda and rho from which they count as injective."""


@dataclass(frozen=True, eq=False)
class EndMaps:
    """``left`` lambda, ``right`` rho: csr (n**4, n**2); ``left_inverse``, ``right_inverse``: csr
    (n**2, n**4), pseudo-inverses.
    """

    left: sparse.csr_matrix
    right: sparse.csr_matrix
    left_inverse: sparse.csr_matrix
    right_inverse: sparse.csr_matrix


def _inverse(matrix: sparse.csr_matrix) -> sparse.csr_matrix | None:
    """``(A^dag A)^-1 A^dag`` on the traceless operators, None if A is not injective there."""
    gram = (matrix.conj().T @ matrix).toarray()[1:, 1:]
    values = np.linalg.eigvalsh(gram)
    if values[0] <= (_INJECTIVE**2) * values[-1] or values[-1] <= 0:
        return None
    inverse = np.zeros((matrix.shape[1], matrix.shape[1]), dtype=complex)
    inverse[1:, 1:] = np.linalg.inv(gram)
    inverse[np.abs(inverse) < 1e-15 * np.abs(inverse).max()] = 0
    return (sparse.csr_matrix(inverse) @ matrix.conj().T).tocsr()


def end_maps(table: CommutatorTable) -> EndMaps | None:
    """The maps of a density; None unless both are injective on traceless operators."""
    base = table.base
    singles = np.arange(base)
    rows = np.arange(base**2)
    left = table.matrix[:, singles].tocsr()
    left = sparse.diags_array((rows // base > 0).astype(float)) @ left
    right = table.matrix[:, singles * base].tocsr()
    right = sparse.diags_array((rows % base > 0).astype(float)) @ right
    maps = [sparse.csr_matrix(left), sparse.csr_matrix(right)]
    for matrix in maps:
        matrix.eliminate_zeros()
    inverses = [_inverse(matrix) for matrix in maps]
    if inverses[0] is None or inverses[1] is None:
        return None
    return EndMaps(maps[0], maps[1], inverses[0], inverses[1])


def _extended(maps: EndMaps, vectors: StringVectors) -> StringVectors:
    """``T a = lambda a + rho a``."""
    return joined(
        [
            vectors.acted(maps.left, 0, 1, 2),
            vectors.acted(maps.right, vectors.width - 1, 1, 2),
        ]
    )


class _Solver:
    """Solves ``T a = y`` and collects the conditions on y as triangular factors."""

    def __init__(self, maps: EndMaps, base: int) -> None:
        self.maps = maps
        self.base = base
        pairs = np.array([x * base + y for x in range(1, base) for y in range(1, base)])
        one = sparse.identity(pairs.size, dtype=complex, format="csr")
        image = _extended(maps, StringVectors(base, 2, pairs, one))
        self.pairs = pairs
        self.rows = image.codes
        self.two_sites: Factored = factored(image.values.tocsc())
        kernel = self.two_sites.null_vectors()
        self.kernel = StringVectors.summed(
            base, 2, pairs[kernel.row], kernel.col, kernel.data, kernel.shape[1]
        )

    def homogeneous(self, width: int) -> StringVectors:
        """Solutions of ``T a = 0`` on exactly ``width`` >= 2 sites, columns of norm one."""
        vectors = self.kernel
        for _ in range(width - 2):
            vectors = vectors.acted(self.maps.left, 0, 1, 2)
        return vectors.times(sparse.diags_array(1 / vectors.norms, format="csr"))

    def solve(self, target: StringVectors) -> tuple[StringVectors, list[np.ndarray]]:
        """Solution on one site less than the target, and what of the target it cannot reach."""
        maps = self.maps
        if target.width == 3:
            dense = target.dense(self.rows)
            known = np.isin(target.codes, self.rows)
            solution, rest = self.two_sites.solve(dense)
            row, column = np.nonzero(solution)
            vectors = StringVectors.summed(
                self.base, 2, self.pairs[row], column, solution[row, column], target.columns
            )
            return vectors, [rest, _triangle(target.values[~known])]
        image = target.acted(maps.left_inverse, 0, 2, 1).acted(maps.left, 0, 1, 2)
        outside = joined([target, image], [1.0, -1.0])
        last = target.width - 2
        part = outside.acted(maps.right_inverse, last, 2, 1)
        first = joined([outside, part.acted(maps.right, last, 1, 2)], [1.0, -1.0])
        remainder = joined([target, _extended(maps, part)], [1.0, -1.0])
        reduced = remainder.acted(maps.left_inverse, 0, 2, 1)
        second = joined([remainder, reduced.acted(maps.left, 0, 1, 2)], [1.0, -1.0])
        inner, conditions = self.solve(reduced)
        whole = joined([part, inner.acted(maps.left, 0, 1, 2)])
        return whole, [_triangle(first.values), _triangle(second.values), *conditions]


def _triangle(values: sparse.csr_matrix) -> np.ndarray:
    """R of a QR factorisation (columns, columns): as many conditions as columns at most."""
    if values.shape[0] <= values.shape[1]:
        return np.asarray(values.toarray())
    return np.asarray(np.linalg.qr(values.toarray(), mode="r"))


def _padded(vectors: StringVectors, count: int, before: int = 0) -> StringVectors:
    """Zero columns added on the right, and ``before`` of them on the left."""
    entries = vectors.values.tocoo()
    matrix = sparse.csr_matrix(
        (entries.data, (entries.row, entries.col + before)), shape=(vectors.codes.size, count)
    )
    return StringVectors(vectors.base, vectors.width, vectors.codes, matrix)


def charges_from_leading_parts(
    density: LocalDensity, maps: EndMaps, length: int
) -> tuple[StringVectors, NullSpace]:
    """Basis of the conserved operators of range up to ``length`` >= 2, over that many sites.

    The record keeps the singular values of the collected conditions; its ``vectors`` are the
    combinations of the free parameters.
    """
    base = density.basis.size
    solver = _Solver(maps, base)
    current = solver.homogeneous(length)
    above: StringVectors | None = None
    parts = [current]
    conditions: list[np.ndarray] = []
    for width in range(length, 1, -1):
        # Strings of exactly ``width`` sites in the commutator, but for those of the next part.
        image = commuted(density.table, parts[-1]).of_range(width)
        if above is not None:
            image = joined([image, _padded(above.of_range(width), image.columns)])
        above = commuted(density.table, parts[-1])
        if width > 2:
            solution, found = solver.solve(image)
            conditions += found
            fresh = solver.homogeneous(width - 1)
        else:
            singles = np.arange(1, base)
            one = sparse.identity(base - 1, dtype=complex, format="csr")
            fresh = StringVectors(base, 1, singles, one)
            solution = StringVectors.summed(
                base, 1, singles[:0], singles[:0], np.zeros(0), image.columns
            )
        count = image.columns + fresh.columns
        level = joined(
            [
                _padded(solution.times(-sparse.identity(image.columns, format="csr")), count),
                _padded(fresh, count, image.columns),
            ]
        )
        if width == 2:
            ends = commuted(density.table, level)
            rest = joined([_padded(image, count), ends.of_range(2)])
            conditions.append(_triangle(rest.values))
            rest = joined([_padded(above.of_range(1), count), ends.of_range(1)])
            conditions.append(_triangle(rest.values))
        parts.append(level)
    count = parts[-1].columns
    whole = joined([_padded(part.widened(length), count) for part in parts])
    rows = [np.pad(block, ((0, 0), (0, count - block.shape[1]))) for block in conditions]
    return whole, _parameters(np.concatenate(rows), count)


def _parameters(conditions: np.ndarray, count: int) -> NullSpace:
    if conditions.shape[0] > count:
        conditions = np.asarray(np.linalg.qr(conditions, mode="r"))
    _, singular, right = np.linalg.svd(conditions, full_matrices=True)
    # The density has norm one, so that conditions without content are rounding errors beside one.
    norm = float(singular.max(initial=1.0))
    rank = int(np.sum(singular > defaults.CHARGES_TOLERANCE * norm))
    return NullSpace(
        sparse.csc_matrix(right[rank:].conj().T),
        float(singular[rank:].max(initial=0.0)) / norm,
        float(singular[rank - 1]) / norm if rank else 1.0,
    )
