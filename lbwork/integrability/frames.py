"""On-site unitaries that make a density sparse, so that its strings decouple.

Charges and couplings need not be diagonal in the basis a density is written in. Candidates are the
eigenvectors of a generic Hermitian combination of the conserved on-site operators, and of the
operators on the left site of its two-site part (an Ising coupling along a tilted axis has one of
them). The candidate whose commutators have the fewest entries is taken.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sparse

from lbwork.integrability.density import LocalDensity
from lbwork.integrability.string_vectors import StringVectors

__all__ = ["Frame", "sparsest_frame"]


@dataclass(frozen=True, eq=False)
class Frame:
    """A density in another on-site basis: ``(w x w)^dag q (w x w)`` with w = ``unitary`` (n, n)."""

    unitary: np.ndarray
    density: LocalDensity

    def returned(self, vectors: StringVectors) -> StringVectors:
        """Operators of the frame in the strings of the original basis."""
        basis = self.density.basis
        images = self.unitary @ basis.matrices @ self.unitary.conj().T
        change = basis.matrices.reshape(basis.size, -1).conj() @ images.reshape(basis.size, -1).T
        change /= basis.dimension
        change[np.abs(change) < 1e-14] = 0
        matrix = sparse.csr_matrix(change)
        for site in range(vectors.width):
            vectors = vectors.acted(matrix, site, 1, 1)
        return vectors


def _rotated(density: LocalDensity, unitary: np.ndarray) -> LocalDensity:
    pair = np.kron(unitary, unitary)
    matrix = pair.conj().T @ density.gauge_fixed @ pair
    # Rounding errors of the rotation would pass for entries.
    matrix[np.abs(matrix) < 1e-13 * np.abs(matrix).max()] = 0
    return LocalDensity(matrix, density.dimension, density.doubled, density.name)


def _eigenvectors(matrices: np.ndarray) -> np.ndarray:
    """Of a generic Hermitian combination of matrices (k, n, n) and their adjoints."""
    generator = np.random.default_rng(17)
    weights = generator.normal(size=(2, matrices.shape[0]))
    generic = np.tensordot(weights[0] + 1j * weights[1], matrices, axes=1)
    return np.asarray(np.linalg.eigh(generic + generic.conj().T)[1])


def sparsest_frame(density: LocalDensity, singles: StringVectors) -> Frame | None:
    """The best frame, or None if the given basis is as good; ``singles``: conserved, one site."""
    basis = density.basis
    candidates = []
    if singles.columns:
        columns = singles.dense(np.arange(basis.size))
        candidates.append(_eigenvectors(np.tensordot(columns.T, basis.matrices, axes=1)))
    left, values, _ = np.linalg.svd(density.coefficients[1:, 1:])
    kept = left[:, values > 1e-10 * max(float(values.max(initial=0.0)), 1e-300)]
    if kept.shape[1]:
        candidates.append(_eigenvectors(np.tensordot(kept.T, basis.matrices[1:], axes=1)))
    best, entries = None, 0.9 * density.table.matrix.nnz
    for unitary in candidates:
        rotated = _rotated(density, unitary)
        if rotated.table.matrix.nnz < entries:
            best, entries = Frame(unitary, rotated), rotated.table.matrix.nnz
    return best
