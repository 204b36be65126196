"""The product basis in which the weak charges of a generator are diagonal.

Charges need not be diagonal in the basis a model is written in (a spin along x, say). The weak
symmetry generators ``ad_a`` with ``a = a^dag`` form a compact Lie algebra; a maximal commuting set
that contains as many diagonal elements as possible is chosen and the on-site unitary that
diagonalises it is returned.
"""

from __future__ import annotations

import numpy as np

from lbwork.symmetry.algebra import GeneratorAlgebra

__all__ = ["ket_matrices", "rotate_terms", "rotation_to_diagonal"]


def ket_matrices(algebra: GeneratorAlgebra, dimension: int) -> np.ndarray:
    """Ket parts a of weak generators ``a kron 1 - 1 kron a^T``: complex (n, sublattices, d, d)."""
    shape = algebra.elements.shape[:2]
    tensor = algebra.elements.reshape(*shape, dimension, dimension, dimension, dimension)
    return np.asarray(np.einsum("nsabcb->nsac", tensor) / dimension)


def _real_vectors(matrices: np.ndarray) -> np.ndarray:
    flat = matrices.reshape(matrices.shape[0], -1)
    return np.concatenate([flat.real, flat.imag], axis=1)


def _null_combinations(columns: np.ndarray, tolerance: float = 1e-8) -> np.ndarray:
    """Coefficient rows c with ``c @ columns = 0``; real (k, n)."""
    if columns.shape[0] == 0:
        return np.zeros((0, 0))
    _, singular, right = np.linalg.svd(columns.T, full_matrices=True)
    rank = int(np.sum(singular > tolerance))
    return right[rank:]


def rotation_to_diagonal(algebra: GeneratorAlgebra, dimension: int) -> np.ndarray | None:
    """On-site unitaries (sublattices, d, d) that diagonalise a maximal set of weak charges.

    Columns are the new basis states. None when a maximal set is diagonal already.
    """
    kets = ket_matrices(algebra, dimension)
    if kets.shape[0] == 0:
        return None
    adjoint = kets.conj().transpose(0, 1, 3, 2)
    hermitian = np.concatenate([kets + adjoint, 1j * (kets - adjoint)])
    vectors = _real_vectors(hermitian)
    _, singular, right = np.linalg.svd(vectors, full_matrices=False)
    independent = right[singular > 1e-8]
    half = independent.shape[1] // 2
    basis = (independent[:, :half] + 1j * independent[:, half:]).reshape(-1, *kets.shape[1:])
    off_diagonal = _real_vectors(basis * (1 - np.eye(dimension)))
    diagonal = np.tensordot(_null_combinations(off_diagonal), basis, axes=1)
    commutators = np.concatenate(
        [_real_vectors(basis @ d - d @ basis) for d in diagonal] or [np.zeros((basis.shape[0], 1))],
        axis=1,
    )
    centraliser = np.tensordot(_null_combinations(commutators), basis, axes=1)
    if np.abs(centraliser * (1 - np.eye(dimension))).max(initial=0.0) < 1e-9:
        return None
    generator = np.random.default_rng(7)
    generic = np.tensordot(generator.normal(size=centraliser.shape[0]), centraliser, axes=1)
    columns = [np.linalg.eigh(matrix)[1][:, ::-1] for matrix in generic]
    return np.array([_fix_phases(unitary) for unitary in columns])


def _fix_phases(unitary: np.ndarray) -> np.ndarray:
    largest = unitary[np.abs(unitary).argmax(axis=0), np.arange(unitary.shape[1])]
    cleaned = unitary * (np.abs(largest) / largest)
    cleaned[np.abs(cleaned) < 1e-15] = 0
    return np.asarray(cleaned)


def doubled_rotation(unitary: np.ndarray) -> np.ndarray:
    """``w kron w*``: takes new coordinates of a density matrix on one site to the old ones."""
    return np.kron(unitary, unitary.conj())


def rotate_terms(
    terms: dict[tuple[int, ...], np.ndarray], rotation: np.ndarray, sublattices: int
) -> dict[tuple[int, ...], np.ndarray]:
    """``W^dag M W`` for every support, with W the product of on-site rotations."""
    rotated = {}
    for support, matrix in terms.items():
        full = np.eye(1)
        for site in support:
            full = np.kron(full, doubled_rotation(rotation[site % sublattices]))
        image = full.conj().T @ matrix @ full
        image[np.abs(image) < 1e-14 * np.abs(image).max()] = 0
        rotated[support] = image
    return rotated
