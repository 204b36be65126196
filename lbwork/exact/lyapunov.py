"""Lyapunov equations in Schur form, by recursive halving.

LAPACK solves the triangular equation entry by entry; cutting it into halves leaves matrix products,
which are some ten times faster at a few thousand unknowns.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.linalg
from scipy.linalg.lapack import dtrsyl, ztrsyl

from lbwork import defaults
from lbwork.errors import ModelError

__all__ = ["SchurForm", "schur_form", "solve_lyapunov"]

BLOCK = 64
"""Triangular equations up to this size go to LAPACK."""


@dataclass(frozen=True, eq=False)
class SchurForm:
    """``X = U T U^dag``: T (n, n) upper triangular, with 2 x 2 blocks for a real X; levels (n,)."""

    triangle: np.ndarray
    basis: np.ndarray
    levels: np.ndarray


def schur_form(matrix: np.ndarray) -> SchurForm:
    """Schur form of a real or complex square matrix, in its own arithmetic."""
    output = "complex" if np.iscomplexobj(matrix) else "real"
    triangle, basis = scipy.linalg.schur(matrix, output=output)
    if output == "complex":
        return SchurForm(triangle, basis, np.diagonal(triangle).copy())
    levels = np.diagonal(triangle).astype(complex)
    below = np.flatnonzero(np.diagonal(triangle, -1))
    # Standard form of a 2 x 2 block: equal diagonal, off-diagonals of opposite sign.
    size = np.sqrt(np.abs(triangle[below, below + 1] * triangle[below + 1, below]))
    levels[below] += 1j * size
    levels[below + 1] -= 1j * size
    return SchurForm(triangle, basis, levels)


def _half(triangle: np.ndarray) -> int:
    """Where to cut; never through a 2 x 2 block."""
    middle = triangle.shape[0] // 2
    return middle + int(triangle[middle, middle - 1] != 0)


def _sylvester(first: np.ndarray, second: np.ndarray, right: np.ndarray) -> np.ndarray:
    """K of ``first K + K second^dag = right`` for upper triangular first and second."""
    rows, columns = right.shape
    if max(rows, columns) <= BLOCK:
        solver, mode = (ztrsyl, "C") if np.iscomplexobj(right) else (dtrsyl, "T")
        solution, scale, _ = solver(first, second, right, trana="N", tranb=mode)
        return np.asarray(solution / scale)
    result = np.empty_like(right)
    if rows >= columns:
        cut = _half(first)
        result[cut:] = _sylvester(first[cut:, cut:], second, right[cut:])
        rest = right[:cut] - first[:cut, cut:] @ result[cut:]
        result[:cut] = _sylvester(first[:cut, :cut], second, rest)
        return result
    cut = _half(second)
    result[:, cut:] = _sylvester(first, second[cut:, cut:], right[:, cut:])
    rest = right[:, :cut] - result[:, cut:] @ second[:cut, cut:].conj().T
    result[:, :cut] = _sylvester(first, second[:cut, :cut], rest)
    return result


def _antisymmetric(triangle: np.ndarray, right: np.ndarray) -> np.ndarray:
    """K of ``T K + K T^dag = right`` for anti-Hermitian right: half the work of the general one."""
    size = right.shape[0]
    if size <= BLOCK:
        solution = _sylvester(triangle, triangle, right)
        return np.asarray((solution - solution.conj().T) / 2)
    cut = _half(triangle)
    corner = triangle[:cut, cut:]
    result = np.empty_like(right)
    lower = _antisymmetric(triangle[cut:, cut:], right[cut:, cut:])
    upper = _sylvester(
        triangle[:cut, :cut], triangle[cut:, cut:], right[:cut, cut:] - corner @ lower
    )
    product = upper @ corner.conj().T
    result[cut:, cut:], result[:cut, cut:], result[cut:, :cut] = lower, upper, -upper.conj().T
    result[:cut, :cut] = _antisymmetric(
        triangle[:cut, :cut], right[:cut, :cut] - product + product.conj().T
    )
    return result


def solve_lyapunov(form: SchurForm, source: np.ndarray) -> np.ndarray:
    """Anti-Hermitian K (n, n) of ``X K + K X^dag + source = 0`` for anti-Hermitian ``source``.

    Costs about as many operations as ten matrix products. Raises ModelError when a level of X does
    not decay, since K is then not determined.
    """
    slowest = float(form.levels.real.max())
    if slowest > -defaults.GENERATOR_TOLERANCE * np.abs(form.levels).max():
        raise ModelError(
            f"a mode of the chain decays at rate {max(-slowest, 0.0):.1e}: the steady state is not "
            "unique; add a jump that damps it"
        )
    basis = form.basis
    rotated = basis.conj().T @ -source @ basis
    solution = basis @ _antisymmetric(form.triangle, rotated) @ basis.conj().T
    return np.asarray((solution - solution.conj().T) / 2)
