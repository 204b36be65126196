"""How close two states are: overlaps, fidelity, trace distance."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.linalg

from lbwork.errors import UsageError
from lbwork.observables.blocks import block_eigenvalues, hermitian_blocks, real_if_close

__all__ = ["Closeness", "closeness", "fidelity", "trace_distance"]


@dataclass(frozen=True)
class Closeness:
    """Of two density matrices: ``overlap`` tr(rho sigma); ``alignment`` tr(rho sigma) over
    sqrt(tr rho^2 tr sigma^2); ``fidelity`` (tr sqrt(sqrt(rho) sigma sqrt(rho)))^2;
    ``trace_distance`` ||rho - sigma||_1 / 2."""

    overlap: float
    alignment: float
    fidelity: float
    trace_distance: float


def _factor(matrix: np.ndarray) -> np.ndarray:
    """``A`` (n, r) with ``A A^dag`` the positive matrix; eigenvalues below rounding are dropped.

    Kept, their noise of 1e-17 would enter a fidelity as its root.
    """
    levels, vectors = scipy.linalg.eigh(real_if_close(matrix), check_finite=False)
    kept = levels > len(levels) * np.finfo(float).eps * max(float(levels[-1]), 0.0)
    return np.asarray(vectors[:, kept] * np.sqrt(levels[kept]))


def fidelity(first: np.ndarray, second: np.ndarray) -> float:
    """``(tr sqrt(sqrt(rho) sigma sqrt(rho)))^2`` of two density matrices (D, D), in 0..1.

    The square of the trace norm of ``A^dag B`` with rho = A A^dag and sigma = B B^dag, on the
    blocks that both share. R. Jozsa, J. Mod. Opt. 41, 2315 (1994), with the square; from memory.
    """
    root = 0.0
    for chosen in hermitian_blocks(first, second):
        where = np.ix_(chosen, chosen)
        product = _factor(first[where]).conj().T @ _factor(second[where])
        if product.size:
            root += float(scipy.linalg.svdvals(product, check_finite=False).sum())
    return root**2


def trace_distance(first: np.ndarray, second: np.ndarray) -> float:
    """``||rho - sigma||_1 / 2`` of two density matrices (D, D), in 0..1."""
    return float(np.sum(np.abs(block_eigenvalues(first - second, disposable=True)))) / 2


def closeness(first: np.ndarray, second: np.ndarray) -> Closeness:
    """How close two density matrices (D, D) are; eigenvalue problems of the blocks they share.

    Raises UsageError when their shapes differ.
    """
    if np.shape(first) != np.shape(second):
        raise UsageError(
            f"states of shapes {np.shape(first)} and {np.shape(second)} cannot be compared; they "
            "must be matrices of one chain"
        )
    overlap = float(np.vdot(first, second).real)
    sizes = float(np.linalg.norm(first) * np.linalg.norm(second))
    return Closeness(
        overlap, overlap / sizes, fidelity(first, second), trace_distance(first, second)
    )
