"""Entropies of parts of the chain, operator-space entanglement and logarithmic negativity.

Cut l lies between sites l and l + 1. All logarithms are natural.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from lbwork import defaults
from lbwork.observables.blocks import block_eigenvalues, block_singular_values

__all__ = [
    "CutEntropies",
    "entanglement_memory",
    "left_entropies",
    "logarithmic_negativity",
    "operator_entanglement",
    "renyi_two",
]


@dataclass(frozen=True, eq=False)
class CutEntropies:
    """Of the left part at each cut, float64 (L-1,): von Neumann entropy and second Renyi entropy
    ``-ln tr rho_l^2``."""

    von_neumann: np.ndarray
    renyi_two: np.ndarray


def renyi_two(density: np.ndarray) -> float:
    """``-ln tr rho^2`` of a density matrix (D, D)."""
    return -float(np.log(np.linalg.norm(density) ** 2))


def _entropy(weights: np.ndarray) -> float:
    kept = weights[weights > 0]
    return max(-float(np.sum(kept * np.log(kept))), 0.0)


def left_entropies(density: np.ndarray, count: int, dimension: int) -> CutEntropies:
    """Entropies of sites 1..l of a density matrix (D, D) for l = 1..L-1."""
    left = density
    first, second = np.zeros(count - 1), np.zeros(count - 1)
    for cut in range(count - 1, 0, -1):
        size = dimension**cut
        left = np.einsum("iaja->ij", left.reshape(size, dimension, size, dimension))
        weights = block_eigenvalues(left)
        first[cut - 1] = _entropy(weights)
        second[cut - 1] = -float(np.log(np.sum(weights**2)))
    return CutEntropies(first, second)


def _split(density: np.ndarray, cut: int, count: int, dimension: int) -> np.ndarray:
    """(left ket, right ket, left bra, right bra) view of a density matrix."""
    left, right = dimension**cut, dimension ** (count - cut)
    return density.reshape(left, right, left, right)


def operator_entanglement(
    density: np.ndarray, count: int, dimension: int
) -> tuple[np.ndarray, np.ndarray]:
    """Entropy of the Schmidt weights of ``rho / ||rho||_F`` as a vector, and their number, per cut.

    Weights below :data:`lbwork.defaults.SCHMIDT_TOLERANCE` are not counted (T. Prosen, I. Pizorn,
    Phys. Rev. A 76, 032316 (2007); from memory). float64 (L-1,) and int64 (L-1,).
    """
    entropies, ranks = np.zeros(count - 1), np.zeros(count - 1, dtype=np.int64)
    for cut in range(1, count):
        tensor = _split(density, cut, count, dimension).transpose(0, 2, 1, 3)
        size = dimension ** (2 * cut)
        weights = block_singular_values(tensor.reshape(size, -1)) ** 2
        weights /= weights.sum()
        entropies[cut - 1] = _entropy(weights)
        ranks[cut - 1] = int(np.sum(weights > defaults.SCHMIDT_TOLERANCE))
    return entropies, ranks


def logarithmic_negativity(density: np.ndarray, count: int, dimension: int) -> np.ndarray:
    """``ln ||rho^(T_left)||_1`` per cut, float64 (L-1,); zero for separable states.

    G. Vidal, R. F. Werner, Phys. Rev. A 65, 032314 (2002); from memory.
    """
    values = np.zeros(count - 1)
    for cut in range(1, count):
        tensor = _split(density, cut, count, dimension).transpose(2, 1, 0, 3)
        weights = block_eigenvalues(tensor.reshape(density.shape))
        values[cut - 1] = max(float(np.log(np.sum(np.abs(weights)))), 0.0)
    return values


def entanglement_memory(count: int, dimension: int) -> int:
    """Bytes that the quantities of this module need besides the density matrix, without blocks."""
    return 16 * 4 * dimension ** (2 * count)
