"""The Lie algebra of on-site symmetry generators of a Lindbladian, by a linear solve.

Sought are all ``Q = sum_j (s_1 ... s_{j-1}) q_j`` with ``[L, Q] = 0``, where the on-site matrices
``q_j`` depend on the sublattice only and ``s`` is an optional string of on-site signs. With
``q = a kron 1 - 1 kron a^T`` these are weak symmetries, with ``a kron 1`` strong ones, with a
general matrix on ket and bra they include symmetries that a generator hides, such as the spin and
pseudospin rotations of XX chains with dephasing (M. Medvedyeva, F. Essler, T. Prosen,
Phys. Rev. Lett. 117, 137202 (2016)), for which the string is the joint parity.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from lbwork.symmetry.canonical import CanonicalTerms, support_parts, terms_norm

__all__ = [
    "GeneratorAlgebra",
    "commuting_generators",
    "ket_generators",
    "superoperator_generators",
    "traceless_basis",
]

_MAX_WINDOW_ENTRIES = 60_000_000


@dataclass(frozen=True, eq=False)
class GeneratorAlgebra:
    """Solutions of ``[L, Q] = 0``: ``elements`` is complex (n, sublattices, q, q).

    ``residual`` is the largest ``||[L, Q]|| / (||L|| ||Q||)`` among them, recomputed.
    """

    elements: np.ndarray
    residual: float

    @property
    def dimension(self) -> int:
        """Number of independent generators."""
        return int(self.elements.shape[0])


def traceless_basis(dimension: int) -> np.ndarray:
    """Traceless matrices, orthonormal in the trace product: complex (dimension**2 - 1, d, d)."""
    elements = []
    for row in range(dimension):
        for column in range(dimension):
            if row != column:
                unit = np.zeros((dimension, dimension), dtype=complex)
                unit[row, column] = 1
                elements.append(unit)
    for level in range(1, dimension):
        diagonal = np.zeros(dimension, dtype=complex)
        diagonal[:level] = 1
        diagonal[level] = -level
        elements.append(np.diag(diagonal / np.sqrt(level * (level + 1))))
    return np.array(elements).reshape(-1, dimension, dimension)


def ket_generators(dimension: int) -> np.ndarray:
    """On-site matrices ``a kron 1 - 1 kron a^T`` for traceless a: the weak symmetries."""
    one = np.eye(dimension)
    return np.array(
        [np.kron(a, one) - np.kron(one, a.T) for a in traceless_basis(dimension)]
    ).reshape(-1, dimension**2, dimension**2)


def superoperator_generators(dimension: int) -> np.ndarray:
    """All traceless on-site superoperators, orthonormal."""
    return traceless_basis(dimension**2)


def _embedded_generators(
    generators: np.ndarray, string: np.ndarray, count: int, position: int
) -> np.ndarray:
    """``s .. s q 1 .. 1`` on a window of ``count`` sites: (n, q**count, q**count)."""
    base = generators.shape[1]
    before = np.eye(1)
    for _ in range(position):
        before = np.kron(before, string)
    after = np.eye(base ** (count - position - 1))
    return np.array([np.kron(np.kron(before, q), after) for q in generators])


def _commutator_parts(
    matrix: np.ndarray, generators: np.ndarray, string: np.ndarray, position: int
) -> dict[tuple[int, ...], np.ndarray]:
    """Parts by support of ``[M, q_u at position]``: slots -> complex (n, entries), normalised."""
    base = generators.shape[1]
    count = round(np.log(matrix.shape[0]) / np.log(base))
    parts: dict[tuple[int, ...], np.ndarray] = {}
    for index, embedded in enumerate(_embedded_generators(generators, string, count, position)):
        commutator = matrix @ embedded - embedded @ matrix
        if np.abs(commutator).max() == 0:
            continue
        for slots, part in support_parts(tuple(range(count)), commutator, base).items():
            table = parts.setdefault(slots, np.zeros((len(generators), part.size), dtype=complex))
            table[index] = part.ravel() / np.sqrt(part.shape[0])
    return parts


def _window_gram(
    terms: CanonicalTerms, generators: np.ndarray, string: np.ndarray, sublattices: int
) -> np.ndarray:
    """Gram matrix of ``[L, Q_u]`` over unknowns u = (sublattice, generator).

    Contributions are collected by exact support, so that pieces of neighbouring terms may cancel.
    """
    count = len(generators)
    unknowns = sublattices * count
    cache: dict[tuple[bytes, int], dict[tuple[int, ...], np.ndarray]] = {}
    collected: dict[tuple[int, ...], np.ndarray] = {}
    for support, matrix in terms.items():
        for position, site in enumerate(support):
            key = (matrix.tobytes(), position)
            if key not in cache:
                cache[key] = _commutator_parts(matrix, generators, string, position)
            block = (site % sublattices) * count
            for slots, part in cache[key].items():
                place = tuple(support[slot] for slot in slots)
                table = collected.setdefault(
                    place, np.zeros((unknowns, part.shape[1]), dtype=complex)
                )
                table[block : block + count] += part
    gram = np.zeros((unknowns, unknowns), dtype=complex)
    for table in collected.values():
        gram += table.conj() @ table.T
    return gram


def commuting_generators(
    terms: CanonicalTerms,
    generators: np.ndarray,
    *,
    string: np.ndarray | None = None,
    sublattices: int = 2,
) -> GeneratorAlgebra | None:
    """All combinations of the given on-site generators that commute with L.

    Parameters: ``generators`` complex (n, q, q); ``string`` an on-site diagonal sign matrix (q, q)
    that must itself be a symmetry when it is not the identity. Returns None when the linear solve
    would need more memory than it is worth (large local dimension) or when a string is asked for
    and some support has a hole, where it is not defined.
    """
    base = generators.shape[1]
    widest = max((len(support) for support in terms), default=1)
    entries = sublattices * len(generators) * base ** (2 * widest) * len(terms)
    if entries > _MAX_WINDOW_ENTRIES:
        return None
    used = np.eye(base) if string is None else string
    if string is not None:
        if any(support[-1] - support[0] >= len(support) for support in terms):
            return None
    norm = terms_norm(terms)
    gram = _window_gram(terms, generators, used, sublattices)
    values, vectors = np.linalg.eigh(gram)
    solutions = vectors[:, values <= (1e-7 * max(norm, 1e-300)) ** 2]
    solutions = _clean(solutions)
    shaped = solutions.T.reshape(-1, sublattices, len(generators))
    elements = np.einsum("nsg,gab->nsab", shaped, generators)
    residual = 0.0
    for column in solutions.T:
        change = float(np.sqrt(max(np.real(column.conj() @ gram @ column), 0.0)))
        residual = max(residual, change / max(norm * float(np.linalg.norm(column)), 1e-300))
    return GeneratorAlgebra(elements, residual)


def _clean(vectors: np.ndarray) -> np.ndarray:
    """A sparse-looking basis of the same column space, by row reduction with pivoting."""
    rows = vectors.T.copy()
    pivot_row = 0
    for column in range(rows.shape[1]):
        if pivot_row == rows.shape[0]:
            break
        best = pivot_row + int(np.argmax(np.abs(rows[pivot_row:, column])))
        if abs(rows[best, column]) < 1e-6:
            continue
        rows[[pivot_row, best]] = rows[[best, pivot_row]]
        rows[pivot_row] /= rows[pivot_row, column]
        for other in range(rows.shape[0]):
            if other != pivot_row:
                rows[other] -= rows[other, column] * rows[pivot_row]
        pivot_row += 1
    rows[np.abs(rows) < 1e-12] = 0
    return np.asarray(rows[:pivot_row].T)


def diagonal_rank(elements: Sequence[np.ndarray] | np.ndarray) -> int:
    """Dimension of the diagonal subspace of a span of generators."""
    stacked = np.asarray(elements)
    if stacked.shape[0] == 0:
        return 0
    base = stacked.shape[-1]
    off = stacked * (1 - np.eye(base))
    rank_off = np.linalg.matrix_rank(off.reshape(stacked.shape[0], -1), tol=1e-8)
    return int(stacked.shape[0] - rank_off)
