"""Inverse of the part without jumps, ``K X = A X + X A^dag`` with ``A = -i Heff``.

Where the eigenvectors of Heff are well conditioned they diagonalise K; close to exceptional points
they do not, and the Schur form of A is used: ``T Y + Y T^dag = C`` with T upper triangular is
solved by splitting it in the middle until the pieces are small (I. Jonsson, B. Kagstrom, ACM
Trans. Math. Softw. 28, 392 (2002); from memory).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.linalg
import scipy.sparse as sparse

from lbwork.iterative.action import sorted_operator
from lbwork.iterative.products import multiply
from lbwork.iterative.space import SectorSpace, hermitian_from_real, real_from_hermitian

__all__ = ["EffectiveResolvent", "sylvester_triangular"]

CONDITION = 1e5
"""Condition number of the eigenvectors above which the Schur form is used."""

LEAF = 48
"""Edge of the triangular equations that LAPACK solves directly."""


@dataclass(frozen=True, eq=False)
class _Factor:
    """``A = left inner right``; ``levels`` (n,) where inner is diagonal, else ``triangle``."""

    left: np.ndarray
    right: np.ndarray
    levels: np.ndarray | None
    triangle: np.ndarray


def _factor(block: np.ndarray) -> _Factor:
    levels, vectors = scipy.linalg.eig(block)
    if np.linalg.cond(vectors) < CONDITION:
        return _Factor(vectors, np.linalg.inv(vectors), levels, np.zeros((0, 0)))
    triangle, unitary = scipy.linalg.schur(block, output="complex")
    return _Factor(unitary, np.ascontiguousarray(unitary.conj().T), None, triangle)


def sylvester_triangular(left: np.ndarray, right: np.ndarray, values: np.ndarray) -> np.ndarray:
    """Y of ``left Y + Y right^dag = values``, both triangles upper; complex (m, n).

    Raises LinAlgError when a pair of diagonal entries adds up to zero.
    """
    rows, columns = values.shape
    if max(rows, columns) <= LEAF:
        solution, scale, info = scipy.linalg.lapack.ztrsyl(left, right, values, tranb="C")
        if info < 0 or scale == 0:
            raise np.linalg.LinAlgError("triangular Sylvester equation is singular")
        return np.asarray(solution / scale)
    result = np.array(values)
    if rows >= columns:
        half = rows // 2
        result[half:] = sylvester_triangular(left[half:, half:], right, result[half:])
        result[:half] -= left[:half, half:] @ result[half:]
        result[:half] = sylvester_triangular(left[:half, :half], right, result[:half])
    else:
        half = columns // 2
        result[:, half:] = sylvester_triangular(left, right[half:, half:], result[:, half:])
        result[:, :half] -= result[:, half:] @ right[:half, half:].conj().T
        result[:, :half] = sylvester_triangular(left, right[:half, :half], result[:, :half])
    return result


class EffectiveResolvent:
    """``X -> (K - delta)^-1 X`` on vectors of a sector; ``delta > 0`` keeps dark states finite."""

    def __init__(self, space: SectorSpace, no_jump: sparse.csr_matrix, delta: float) -> None:
        ordered = sorted_operator(no_jump, space)
        bounds = space.groups.bounds
        self._space = space
        self._factors: dict[int, _Factor] = {}
        for group in {group for pair in space.pairs for group in pair}:
            inside = slice(bounds[group], bounds[group + 1])
            block = ordered[inside, inside].toarray()
            np.fill_diagonal(block, block.diagonal() - delta / 2)
            self._factors[group] = _factor(block)

    @property
    def defective(self) -> bool:
        """Whether the Schur form was needed in some group."""
        return any(factor.levels is None for factor in self._factors.values())

    def apply(self, vector: np.ndarray) -> np.ndarray:
        """The image of a vector; worked out in double precision."""
        result = np.empty_like(vector)
        for (ket, bra), block, out in zip(
            self._space.pairs,
            self._space.blocks(vector),
            self._space.blocks(result),
            strict=True,
        ):
            hermitian = self._space.hermitian
            full = hermitian_from_real(block.astype(float)) if hermitian else block.astype(complex)
            solved = self._solve(full, self._factors[ket], self._factors[bra])
            out[:] = real_from_hermitian(solved) if hermitian else solved
        return result

    def _solve(self, block: np.ndarray, ket: _Factor, bra: _Factor) -> np.ndarray:
        inner = multiply(multiply(ket.right, block), bra.right.conj().T)
        if ket.levels is not None and bra.levels is not None:
            inner /= ket.levels[:, None] + bra.levels.conj()[None, :]
        else:
            inner = sylvester_triangular(_triangle(ket), _triangle(bra), inner)
        return multiply(multiply(ket.left, inner), bra.left.conj().T)


def _triangle(factor: _Factor) -> np.ndarray:
    return factor.triangle if factor.levels is None else np.diag(factor.levels)
