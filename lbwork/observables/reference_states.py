"""States to compare with: product states, Gibbs states, the maximally mixed state."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import scipy.linalg
from scipy.sparse.csgraph import connected_components

from lbwork.errors import UsageError
from lbwork.generator import Lindbladian
from lbwork.model import Model
from lbwork.observables.blocks import block_eigenvalues, hermitian_blocks, real_if_close
from lbwork.observables.local import local_magnetisation, spin_operators

__all__ = [
    "checked_density",
    "gibbs_state",
    "maximally_mixed",
    "product_state",
    "spin_coherent",
]

_TOLERANCE = 1e-10
"""Absolute: of the trace, of the smallest eigenvalue, of an entry's distance from Hermiticity."""


def _skewness(matrix: np.ndarray) -> float:
    """``max |A - A^dag|``, in strips so that the adjoint is never stored."""
    step = 256
    return max(
        float(np.abs(matrix[at : at + step] - matrix[:, at : at + step].conj().T).max())
        for at in range(0, len(matrix), step)
    )


def _is_positive(density: np.ndarray) -> bool:
    """Whether ``rho + tolerance`` has a Cholesky factor; far cheaper than its eigenvalues."""
    for chosen in hermitian_blocks(density):
        block = real_if_close(density[np.ix_(chosen, chosen)])
        block[np.diag_indices_from(block)] += _TOLERANCE
        try:
            scipy.linalg.cholesky(block.T, overwrite_a=True, check_finite=False)
        except scipy.linalg.LinAlgError:
            return False
    return True


def checked_density(matrix: np.ndarray, size: int, name: str) -> np.ndarray:
    """The matrix as complex128 when it is a density matrix (size, size); UsageError otherwise.

    Not copied when it is complex128 already. The error says which property fails, by how much.
    """
    density = np.asarray(matrix, dtype=complex)
    if density.shape != (size, size):
        raise UsageError(f"{name} has shape {density.shape}; it must be ({size}, {size})")
    if not np.all(np.isfinite(density)):
        raise UsageError(f"{name} has entries that are not numbers")
    skew = _skewness(density)
    if skew > _TOLERANCE:
        raise UsageError(f"{name} is not Hermitian: it differs from its adjoint by {skew:.1e}")
    trace = float(np.trace(density).real)
    if abs(trace - 1) > _TOLERANCE:
        raise UsageError(f"{name} has trace {trace:.6g}; divide by it")
    if not _is_positive(density):
        smallest = float(block_eigenvalues(density).min())
        raise UsageError(f"{name} has the negative eigenvalue {smallest:.1e}")
    return density


def maximally_mixed(count: int, dimension: int) -> np.ndarray:
    """``1 / D`` with D = d**L, complex (D, D)."""
    size = dimension**count
    return np.eye(size, dtype=complex) / size


def spin_coherent(theta: float, phi: float, dimension: int = 2) -> np.ndarray:
    """The pure one-site state that points along (theta, phi), complex (d, d); angles in radians.

    ``<S> = s (sin theta cos phi, sin theta sin phi, cos theta)`` with s = (d-1)/2: for d = 2 the
    state cos(theta/2) |up> + e^(i phi) sin(theta/2) |down>. Highest eigenvector of the spin along
    that direction (J. M. Radcliffe, J. Phys. A 4, 313 (1971); from memory).
    """
    if not (np.isfinite(theta) and np.isfinite(phi)):
        raise UsageError(f"angles {theta} and {phi} must be finite numbers of radians")
    x, y, z = spin_operators(dimension).values()
    along = np.sin(theta) * (np.cos(phi) * x + np.sin(phi) * y) + np.cos(theta) * z
    vector = np.linalg.eigh(along)[1][:, -1]
    return np.outer(vector, vector.conj())


def product_state(sites: Sequence[np.ndarray]) -> np.ndarray:
    """Kronecker product of one-site density matrices (d, d), site 1 first; complex (D, D).

    Raises UsageError when one of them is not a density matrix or none is given.
    """
    if not sites:
        raise UsageError("a product state needs at least one site")
    state = np.eye(1, dtype=complex)
    for number, matrix in enumerate(sites, start=1):
        name = f"the state of site {number}"
        if np.ndim(matrix) != 2:
            raise UsageError(f"{name} has shape {np.shape(matrix)}; it must be a square matrix")
        state = np.kron(state, checked_density(matrix, np.shape(matrix)[0], name))
    return state


def gibbs_state(model: Model, beta: float, field: float = 0.0) -> np.ndarray:
    """``exp(-beta (H - field M)) / Z`` with M = sum m_j the magnetisation; complex (D, D).

    ``m_j`` is sigma^z for d = 2 and 2 S^z otherwise: a chemical potential mu of particles
    n = (1 + sigma^z)/2 is the field mu/2. The blocks that H falls into are diagonalised one by
    one. ``beta = 0`` gives the maximally mixed state, negative ones inverted populations. Raises
    UsageError for numbers that are not finite.
    """
    if not (np.isfinite(beta) and np.isfinite(field)):
        raise UsageError(f"inverse temperature {beta} and field {field} must be finite")
    energy = Lindbladian(model).hamiltonian()
    energy.eliminate_zeros()
    total = np.zeros(1)
    for _ in range(model.sites):
        total = np.add.outer(total, local_magnetisation(model.local_dimension)).ravel()
    number, labels = connected_components(abs(energy), directed=False)
    solved = []
    for block in range(number):
        chosen = np.flatnonzero(labels == block)
        matrix = energy[chosen][:, chosen].toarray()
        matrix[np.diag_indices_from(matrix)] -= field * total[chosen]
        solved.append((chosen, *scipy.linalg.eigh(real_if_close(matrix), overwrite_a=True)))
    # Exponents relative to the largest one: no overflow, whatever the energies.
    lowest = max(float((-beta * levels).max()) for _, levels, _ in solved)
    state = np.zeros(energy.shape, dtype=complex)
    for chosen, levels, vectors in solved:
        weights = np.exp(-beta * levels - lowest)
        state[np.ix_(chosen, chosen)] = (vectors * weights) @ vectors.conj().T
    state /= np.trace(state).real
    return state
