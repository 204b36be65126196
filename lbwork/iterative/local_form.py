"""The generator in the form that splits along charges: traceless jumps in the charges' basis.

``l -> l - c`` with ``H -> H + (i g / 2)(c* l - c l^dag)`` leaves the generator as it is; with
traceless jumps H is unique up to a constant, so every symmetry of the generator is one of H and of
the dissipator alone (A. Gorini, A. Kossakowski, E. C. G. Sudarshan, J. Math. Phys. 17, 821 (1976);
from memory).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
import scipy.sparse as sparse

from lbwork.generator.embedding import embed
from lbwork.model import Model

__all__ = ["LocalForm", "SupportJumps", "local_form", "sorted_sites", "turned_operator"]

_DROP = 1e-15


@dataclass(frozen=True, eq=False)
class SupportJumps:
    """All jumps on one support: ``superoperator[a, b, a', b'] = sum_k g_k l_k[a, a'] l_k[b, b']*``.

    ``sites`` sorted, 0-based; ``decay`` is ``sum_k g_k l_k^dag l_k``, complex (d**k, d**k).
    """

    sites: tuple[int, ...]
    superoperator: np.ndarray
    decay: np.ndarray

    def dissipator(self) -> np.ndarray:
        """``sum_k g_k (l . l^dag - 1/2 {l^dag l, .})`` as a matrix on (a, b), (d**2k, d**2k)."""
        size = self.decay.shape[0]
        one = np.eye(size)
        matrix = self.superoperator.reshape(size**2, size**2)
        loss = np.kron(self.decay, one) + np.kron(one, self.decay.T)
        return np.asarray(matrix - loss / 2)


@dataclass(frozen=True, eq=False)
class LocalForm:
    """Hamiltonian csr (D, D) and jumps by support, in the basis of the charges.

    ``rotation`` (sublattices, d, d) takes this basis to the written one, None when they are equal.
    """

    sites: int
    dimension: int
    hamiltonian: sparse.csr_matrix
    jumps: tuple[SupportJumps, ...]
    rotation: np.ndarray | None

    @cached_property
    def decay(self) -> sparse.csr_matrix:
        """``sum_k g_k l_k^dag l_k``, complex csr (D, D)."""
        size = self.dimension**self.sites
        total = sparse.csr_matrix((size, size), dtype=complex)
        for jump in self.jumps:
            total = total + embed(jump.decay, jump.sites, self.sites, self.dimension)
        return total

    @cached_property
    def no_jump(self) -> sparse.csr_matrix:
        """``A = -i Heff = -i H - decay / 2``; the part without jumps is ``A rho + rho A^dag``."""
        total = (-1j * self.hamiltonian - self.decay / 2).tocsr()
        total.data[np.abs(total.data) < _DROP * np.abs(total.data).max(initial=0.0)] = 0
        total.eliminate_zeros()
        return total


def _site_rotation(
    rotation: np.ndarray | None, sites: tuple[int, ...], dimension: int
) -> np.ndarray:
    full = np.eye(1)
    for site in sites:
        local = np.eye(dimension) if rotation is None else rotation[site % len(rotation)]
        full = np.kron(full, local)
    return full


def turned_operator(
    rotation: np.ndarray | None, sites: tuple[int, ...], dimension: int
) -> np.ndarray | None:
    """The rotation of some sites as a matrix (d**k, d**k), None where there is none."""
    return None if rotation is None else _site_rotation(rotation, sites, dimension)


def sorted_sites(sites: tuple[int, ...]) -> tuple[int, ...]:
    """Sites in ascending order."""
    return tuple(sorted(int(site) for site in sites))


def _cleaned(matrix: np.ndarray) -> np.ndarray:
    """Rounding of the rotation removed, so that what vanishes by symmetry is exactly zero."""
    scale = np.abs(matrix).max(initial=0.0)
    result = np.where(np.abs(matrix.real) < _DROP * 10 * scale, 0, matrix.real)
    return result + 1j * np.where(np.abs(matrix.imag) < _DROP * 10 * scale, 0, matrix.imag)


def _sorted_sites(
    sites: tuple[int, ...], matrix: np.ndarray, dimension: int
) -> tuple[tuple[int, ...], np.ndarray]:
    order = np.argsort(sites)
    count = len(sites)
    tensor = matrix.reshape((dimension,) * (2 * count))
    tensor = tensor.transpose([*order, *(count + order)])
    return tuple(int(sites[index]) for index in order), tensor.reshape(matrix.shape)


def local_form(model: Model, rotation: np.ndarray | None = None) -> LocalForm:
    """Split a model into Hamiltonian and jumps by support after rotating each site."""
    sites, dimension = model.sites, model.local_dimension
    size = dimension**sites
    hamiltonian = sparse.csr_matrix((size, size), dtype=complex)
    pieces: list[tuple[tuple[int, ...], np.ndarray]] = []
    for placed in model.placed_hamiltonian():
        turn = _site_rotation(rotation, placed.sites, dimension)
        pieces.append((placed.sites, turn.conj().T @ placed.matrix @ turn))
    gathered: dict[tuple[int, ...], list[np.ndarray]] = {}
    for jump in model.placed_jumps():
        turn = _site_rotation(rotation, jump.sites, dimension)
        matrix = turn.conj().T @ jump.matrix @ turn
        constant = np.trace(matrix) / matrix.shape[0]
        matrix = matrix - constant * np.eye(matrix.shape[0])
        shift = constant.conjugate() * matrix - constant * matrix.conj().T
        pieces.append((jump.sites, 0.5j * jump.rate * shift))
        support, ordered = _sorted_sites(jump.sites, np.sqrt(jump.rate) * matrix, dimension)
        gathered.setdefault(support, []).append(_cleaned(ordered))
    for support, matrix in pieces:
        hamiltonian = hamiltonian + embed(_cleaned(matrix), support, sites, dimension)
    hamiltonian.eliminate_zeros()
    jumps = []
    for support, operators in sorted(gathered.items()):
        stack = np.array(operators)
        superoperator = np.einsum("kac,kbd->abcd", stack, stack.conj())
        decay = np.einsum("kba,kbc->ac", stack.conj(), stack)
        if np.any(superoperator):
            jumps.append(SupportJumps(support, _cleaned(superoperator), _cleaned(decay)))
    return LocalForm(sites, dimension, hamiltonian.tocsr(), tuple(jumps), rotation)
