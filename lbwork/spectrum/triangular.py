"""Eigenvalue condition numbers from a Schur form.

For upper triangular T with eigenvalues on its diagonal the right eigenvector of level j has support
on rows 0..j and the left one on rows j..n-1, so they overlap in one entry; with that entry set to 1
the condition number is ``kappa_j = ||x_j|| ||y_j||``. Unitary similarity leaves it unchanged: the
Schur vectors are never needed. (Golub and Van Loan, Matrix Computations, section 7.2.)
"""

from __future__ import annotations

import numpy as np

__all__ = ["complex_schur_form", "triangular_condition_numbers"]

_ROW_BLOCK = 48
_COLUMN_BLOCK = 1024
_LARGEST = 1e100


def complex_schur_form(form: np.ndarray) -> np.ndarray:
    """Turn a real Schur form (n, n) float64 into a complex triangular one, complex128.

    Every 2 x 2 block on the diagonal is rotated into triangular form; the diagonal keeps its order.
    """
    triangle = np.asfortranarray(form, dtype=complex)
    for start in np.flatnonzero(np.diagonal(form, -1)):
        stop = start + 2
        block = triangle[start:stop, start:stop]
        # LAPACK standardises the blocks to equal diagonal entries and lower * upper < 0.
        level = block[0, 0] + 1j * np.sqrt(-(block[0, 1] * block[1, 0]).real)
        vector = np.array([block[0, 1], level - block[0, 0]])
        if abs(block[1, 0]) > abs(block[0, 1]):
            vector = np.array([level - block[1, 1], block[1, 0]])
        vector /= np.linalg.norm(vector)
        rotation = np.array([[vector[0], -vector[1].conj()], [vector[1], vector[0].conj()]])
        triangle[start:stop, start:] = rotation.conj().T @ triangle[start:stop, start:]
        triangle[:stop, start:stop] = triangle[:stop, start:stop] @ rotation
        triangle[start + 1, start] = 0
    return triangle


def triangular_condition_numbers(form: np.ndarray, levels: np.ndarray) -> np.ndarray:
    """Condition numbers (n,) of the eigenvalues of an upper triangular (n, n) complex array.

    ``levels`` (n,) replaces the diagonal, so that exactly conjugate pairs stay exact. Coinciding
    levels are told apart by machine epsilon times the norm, as LAPACK does: a defective pair gets a
    large number, as its sensitivity to rounding asks for; long Jordan chains give infinity.
    """
    magnitude = np.abs(form)
    norm = np.sqrt(magnitude.sum(axis=0).max() * magnitude.sum(axis=1).max())
    del magnitude
    smallest = max(np.finfo(float).eps * norm, np.finfo(float).tiny)
    right = _vector_norms(form, levels, smallest)
    mirrored = np.asfortranarray(form.T[::-1, ::-1])
    left = _vector_norms(mirrored, levels[::-1], smallest)[::-1]
    with np.errstate(over="ignore"):
        return np.asarray(right * left)


def _vector_norms(form: np.ndarray, levels: np.ndarray, smallest: float) -> np.ndarray:
    """Norms of the right eigenvectors, scaled to 1 in their diagonal entry, by blocked columns."""
    count = levels.size
    norms = np.empty(count)
    for begin in range(0, count, _COLUMN_BLOCK):
        end = min(begin + _COLUMN_BLOCK, count)
        vectors = np.zeros((end, end - begin), dtype=complex)
        for high in range(end, 0, -_ROW_BLOCK):
            low = max(high - _ROW_BLOCK, 0)
            known = -(form[low:high, high:end] @ vectors[high:end])
            for row in range(high - 1, low - 1, -1):
                _substitute(form, levels, vectors, known, (begin, low, high, row), smallest)
        diagonal = np.abs(vectors[np.arange(begin, end), np.arange(end - begin)])
        with np.errstate(divide="ignore", over="ignore"):
            norms[begin:end] = np.linalg.norm(vectors, axis=0) / diagonal
    return norms


def _substitute(
    form: np.ndarray,
    levels: np.ndarray,
    vectors: np.ndarray,
    known: np.ndarray,
    position: tuple[int, int, int, int],
    smallest: float,
) -> None:
    """Solve one row of the back substitution for all columns of the block to its right."""
    begin, low, high, row = position
    first = max(row + 1 - begin, 0)
    if first < vectors.shape[1]:
        rest = (
            known[row - low, first:] - form[row, row + 1 : high] @ vectors[row + 1 : high, first:]
        )
        distance = levels[row] - levels[begin + first : begin + vectors.shape[1]]
        distance[np.abs(distance) < smallest] = smallest
        vectors[row, first:] = rest / distance
        large = first + np.flatnonzero(np.abs(vectors[row, first:]) > _LARGEST)
        if large.size:
            # Long chains of nearly equal levels grow beyond the number range.
            factors = 1 / np.abs(vectors[row, large])
            vectors[row:, large] *= factors
            known[:, large] *= factors
    if row >= begin:
        vectors[row, row - begin] = 1
