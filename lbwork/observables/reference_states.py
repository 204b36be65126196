"""States to compare with, product and Gibbs states, and how close two states are."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import scipy.linalg

from lbwork.errors import UsageError
from lbwork.generator import Lindbladian
from lbwork.model import Model
from lbwork.observables.blocks import block_eigenvalues
from lbwork.observables.local import local_magnetisation

__all__ = ["Closeness", "checked_density", "closeness", "gibbs_state", "product_state"]


@dataclass(frozen=True)
class Closeness:
    """Of two density matrices: ``overlap`` tr(rho sigma); ``alignment`` tr(rho sigma) over
    sqrt(tr rho^2 tr sigma^2); ``fidelity`` (tr sqrt(sqrt(rho) sigma sqrt(rho)))^2;
    ``trace_distance`` ||rho - sigma||_1 / 2."""

    overlap: float
    alignment: float
    fidelity: float
    trace_distance: float


def checked_density(matrix: np.ndarray, size: int, name: str) -> np.ndarray:
    """The matrix as complex128 when it is a density matrix (size, size); UsageError otherwise."""
    density = np.asarray(matrix, dtype=complex)
    if density.shape != (size, size):
        raise UsageError(f"{name} has shape {density.shape}; it must be ({size}, {size})")
    if not np.all(np.isfinite(density)):
        raise UsageError(f"{name} has entries that are not numbers")
    skew = float(np.abs(density - density.conj().T).max())
    if skew > 1e-10:
        raise UsageError(f"{name} is not Hermitian: it differs from its adjoint by {skew:.1e}")
    trace = float(np.trace(density).real)
    if abs(trace - 1) > 1e-10:
        raise UsageError(f"{name} has trace {trace:.6g}; divide by it")
    smallest = float(block_eigenvalues(density).min())
    if smallest < -1e-10:
        raise UsageError(f"{name} has the negative eigenvalue {smallest:.1e}")
    return density


def product_state(sites: Sequence[np.ndarray]) -> np.ndarray:
    """Kronecker product of one-site density matrices (d, d), site 1 first; complex (D, D).

    Raises UsageError when one of them is not a density matrix.
    """
    if not sites:
        raise UsageError("a product state needs at least one site")
    state = np.eye(1, dtype=complex)
    for number, matrix in enumerate(sites, start=1):
        size = np.asarray(matrix).shape[0]
        state = np.kron(state, checked_density(matrix, size, f"the state of site {number}"))
    return state


def gibbs_state(model: Model, beta: float, field: float = 0.0) -> np.ndarray:
    """``exp(-beta (H - field M)) / Z`` with M the magnetisation; complex (D, D).

    ``beta = 0`` gives the maximally mixed state. Raises UsageError for numbers that are not finite.
    """
    if not (np.isfinite(beta) and np.isfinite(field)):
        raise UsageError(f"inverse temperature {beta} and field {field} must be finite")
    energy = Lindbladian(model).hamiltonian().toarray()
    values = local_magnetisation(model.local_dimension)
    total = np.zeros(1)
    for _ in range(model.sites):
        total = (total[:, None] + values[None, :]).ravel()
    energy[np.diag_indices_from(energy)] -= field * total
    levels, vectors = scipy.linalg.eigh(energy, overwrite_a=True)
    exponents = -beta * levels
    weights = np.exp(exponents - exponents.max())
    weights /= weights.sum()
    return np.asarray((vectors * weights) @ vectors.conj().T)


def closeness(first: np.ndarray, second: np.ndarray) -> Closeness:
    """How close two density matrices (D, D) are; dense eigenvalue problems of size D."""
    overlap = float(np.vdot(first, second).real)
    sizes = float(np.linalg.norm(first) * np.linalg.norm(second))
    levels, vectors = scipy.linalg.eigh(first)
    root = (vectors * np.sqrt(np.clip(levels, 0, None))) @ vectors.conj().T
    inner = block_eigenvalues(root @ second @ root)
    fidelity = float(np.sum(np.sqrt(np.clip(inner, 0, None)))) ** 2
    distance = float(np.sum(np.abs(block_eigenvalues(first - second)))) / 2
    return Closeness(overlap, overlap / sizes, fidelity, distance)
