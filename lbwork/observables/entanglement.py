"""Operator-space entanglement and logarithmic negativity of a state, per cut.

Cut l lies between sites l and l + 1. All logarithms are natural.
"""

from __future__ import annotations

import numpy as np

from lbwork import defaults
from lbwork.observables.blocks import block_eigenvalues, block_gram_eigenvalues
from lbwork.observables.entropies import entropy_of_weights

__all__ = ["logarithmic_negativity", "operator_entanglement", "schmidt_weights"]

_HERMITIAN = 1e-13
_ROUNDING = float(np.finfo(float).eps)


def _split(density: np.ndarray, cut: int, count: int, dimension: int) -> np.ndarray:
    """(left ket, right ket, left bra, right bra) view of a density matrix."""
    left, right = dimension**cut, dimension ** (count - cut)
    return density.reshape(left, right, left, right)


def _is_hermitian(matrix: np.ndarray) -> bool:
    """To rounding, compared in strips so that the adjoint is never stored."""
    bound = _HERMITIAN * float(np.abs(np.diagonal(matrix)).max(initial=0.0))
    step = 256
    return all(
        np.abs(matrix[start : start + step] - matrix[:, start : start + step].conj().T).max()
        <= bound
        for start in range(0, len(matrix), step)
    )


def _schmidt_matrix(
    density: np.ndarray, cut: int, count: int, dimension: int, hermitian: bool
) -> np.ndarray:
    """``rho`` as a matrix from operators of the right part to those of the left part.

    A Hermitian one is expanded in the Hermitian operators ``(1+i)/2 |a><b| + (1-i)/2 |b><a|``,
    orthonormal with real coefficients; for both parts at once that is the real matrix
    ``Im <ab|rho|a'b'> + Re <ab'|rho|a'b>`` with rows (a a') and columns (b b').
    """
    tensor = _split(density, cut, count, dimension)
    left = dimension**cut
    if not (hermitian and np.iscomplexobj(density)):
        return tensor.transpose(0, 2, 1, 3).reshape(left * left, -1)
    matrix = np.array(tensor.imag.transpose(0, 2, 1, 3), order="C")
    matrix += tensor.real.transpose(0, 2, 3, 1)
    return matrix.reshape(left * left, -1)


def _weights(
    density: np.ndarray, cut: int, count: int, dimension: int, hermitian: bool
) -> np.ndarray:
    matrix = _schmidt_matrix(density, cut, count, dimension, hermitian)
    weights = np.sort(np.clip(block_gram_eigenvalues(matrix), 0, None))[::-1]
    return np.asarray(weights / weights.sum())


def schmidt_weights(density: np.ndarray, cut: int, count: int, dimension: int) -> np.ndarray:
    """Squared Schmidt coefficients of ``rho / ||rho||_F`` across one cut, descending, sum 1.

    float64 (r,); those that vanish identically are left out. The absolute error is rounding.
    ``density`` (D, D) may be any operator; Hermitian ones take a quarter of the time.
    """
    return _weights(density, cut, count, dimension, _is_hermitian(density))


def operator_entanglement(
    density: np.ndarray, count: int, dimension: int
) -> tuple[np.ndarray, np.ndarray]:
    """``-sum p ln p`` of the Schmidt weights p of ``rho / ||rho||_F`` as a vector, and their
    number, per cut: float64 (L-1,) and int64 (L-1,).

    The vector lives on the doubled chain with d**2 states per site. The rank counts weights above
    :data:`lbwork.defaults.SCHMIDT_TOLERANCE`. A product state has entropy 0 and rank 1; a pure
    state has twice its entanglement entropy, in contrast to the negativity classical correlations
    count as well. T. Prosen, I. Pizorn, Phys. Rev. A 76, 032316 (2007); from memory.
    """
    entropies, ranks = np.zeros(count - 1), np.zeros(count - 1, dtype=np.int64)
    hermitian = _is_hermitian(density)
    for cut in range(1, count):
        weights = _weights(density, cut, count, dimension, hermitian)
        entropies[cut - 1] = entropy_of_weights(weights[weights > _ROUNDING])
        ranks[cut - 1] = int(np.sum(weights > defaults.SCHMIDT_TOLERANCE))
    return entropies, ranks


def logarithmic_negativity(density: np.ndarray, count: int, dimension: int) -> np.ndarray:
    """``ln ||rho^(T_left)||_1`` per cut, natural logarithm, float64 (L-1,).

    The partial transpose exchanges ket and bra of sites 1..l of a density matrix (D, D). Zero for
    separable states, ln 2 for a Bell pair. G. Vidal, R. F. Werner, Phys. Rev. A 65, 032314 (2002)
    use the binary logarithm; from memory.
    """
    values = np.zeros(count - 1)
    for cut in range(1, count):
        tensor = _split(density, cut, count, dimension).transpose(2, 1, 0, 3)
        weights = block_eigenvalues(tensor.reshape(density.shape), disposable=True)
        values[cut - 1] = max(float(np.log(np.sum(np.abs(weights)))), 0.0)
    return values
