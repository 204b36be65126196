"""Purity and entropies of a state and of its left parts, natural logarithms.

``S(rho) = -tr rho ln rho`` (von Neumann) and ``S_2(rho) = -ln tr rho^2`` (second Renyi entropy), of
the whole state and of the sites 1..l left of every cut l = 1..L-1.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from lbwork.observables.blocks import block_eigenvalues

__all__ = [
    "CutEntropies",
    "entropy_of_weights",
    "left_entropies",
    "purity",
    "renyi_two",
    "von_neumann_entropy",
]


@dataclass(frozen=True, eq=False)
class CutEntropies:
    """Of the left part at each cut, float64 (L-1,): von Neumann entropy and second Renyi entropy
    ``-ln tr rho_l^2``."""

    von_neumann: np.ndarray
    renyi_two: np.ndarray


def entropy_of_weights(weights: np.ndarray) -> float:
    """``-sum w ln w`` over the positive weights, and not below zero."""
    kept = weights[weights > 0]
    return max(-float(np.sum(kept * np.log(kept))), 0.0)


def purity(density: np.ndarray) -> float:
    """``tr rho^2`` of a density matrix (D, D): 1 for pure states, 1/D for the mixed one."""
    return float(np.linalg.norm(density)) ** 2


def renyi_two(density: np.ndarray) -> float:
    """``-ln tr rho^2`` of a density matrix (D, D)."""
    return -2 * float(np.log(np.linalg.norm(density)))


def von_neumann_entropy(density: np.ndarray) -> float:
    """``-tr rho ln rho`` of a density matrix (D, D), from its eigenvalues block by block."""
    return entropy_of_weights(block_eigenvalues(density))


def left_entropies(density: np.ndarray, count: int, dimension: int) -> CutEntropies:
    """Entropies of sites 1..l of a density matrix (D, D) for l = 1..L-1.

    Sites are traced out one after the other from the right, so that the largest matrix besides the
    density has (D/d)**2 entries.
    """
    left = density
    first, second = np.zeros(count - 1), np.zeros(count - 1)
    for cut in range(count - 1, 0, -1):
        size = dimension**cut
        left = np.einsum("iaja->ij", left.reshape(size, dimension, size, dimension))
        first[cut - 1] = von_neumann_entropy(left)
        second[cut - 1] = renyi_two(left)
    return CutEntropies(first, second)
