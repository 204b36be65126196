"""The generator as a sum of local superoperators on the doubled chain.

A site of the doubled chain has ``d**2`` states, digit ``d a + b`` for ``|a><b|``; factors of a
k-site term are interleaved ``(a1 b1 a2 b2 ...)``.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from lbwork.model import Model

__all__ = ["SuperTerm", "doubled_to_vector", "superoperator_terms", "vector_to_doubled"]


@dataclass(frozen=True, eq=False)
class SuperTerm:
    """A local superoperator: 0-based ``sites`` and complex128 ``matrix`` (d**(2k), d**(2k))."""

    sites: tuple[int, ...]
    matrix: np.ndarray


def left_right(left: np.ndarray, right: np.ndarray, count: int, dimension: int) -> np.ndarray:
    """Interleaved matrix of ``rho -> left rho right^T``, i.e. ``left kron right`` reordered."""
    tensor = np.kron(left, right).reshape((dimension,) * (4 * count))
    order = [axis for site in range(count) for axis in (site, count + site)]
    tensor = tensor.transpose([*order, *(2 * count + axis for axis in order)])
    return tensor.reshape(dimension ** (2 * count), dimension ** (2 * count))


def superoperator_terms(model: Model) -> tuple[SuperTerm, ...]:
    """All local superoperators of a model; their sum is L.

    Hamiltonian terms give ``-i (h kron 1 - 1 kron h^T)``, jumps
    ``g (l kron l* - 1/2 l^dag l kron 1 - 1/2 1 kron (l^dag l)^T)``.
    """
    dimension = model.local_dimension
    terms = []
    for placed in model.placed_hamiltonian():
        count = len(placed.sites)
        one = np.eye(dimension**count)
        matrix = left_right(placed.matrix, one, count, dimension)
        matrix = matrix - left_right(one, placed.matrix.T, count, dimension)
        terms.append(SuperTerm(placed.sites, -1j * matrix))
    for jump in model.placed_jumps():
        count = len(jump.sites)
        one = np.eye(dimension**count)
        decay = jump.matrix.conj().T @ jump.matrix
        matrix = left_right(jump.matrix, jump.matrix.conj(), count, dimension)
        matrix = matrix - 0.5 * left_right(decay, one, count, dimension)
        matrix = matrix - 0.5 * left_right(one, decay.T, count, dimension)
        terms.append(SuperTerm(jump.sites, jump.rate * matrix))
    return tuple(terms)


def _axes(sites: int) -> list[int]:
    return [axis for site in range(sites) for axis in (site, sites + site)]


def vector_to_doubled(vector: np.ndarray, sites: int, dimension: int) -> np.ndarray:
    """Row-major ``vec(rho)`` (index ket * D + bra) to doubled-chain order; first axis."""
    rest = vector.shape[1:]
    tensor = vector.reshape((dimension,) * (2 * sites) + rest)
    extra = range(2 * sites, 2 * sites + len(rest))
    return np.ascontiguousarray(tensor.transpose([*_axes(sites), *extra])).reshape(vector.shape)


def doubled_to_vector(vector: np.ndarray, sites: int, dimension: int) -> np.ndarray:
    """Inverse of :func:`vector_to_doubled`."""
    rest = vector.shape[1:]
    tensor = vector.reshape((dimension,) * (2 * sites) + rest)
    extra = range(2 * sites, 2 * sites + len(rest))
    order = [int(axis) for axis in np.argsort(_axes(sites))]
    return np.ascontiguousarray(tensor.transpose([*order, *extra])).reshape(vector.shape)
