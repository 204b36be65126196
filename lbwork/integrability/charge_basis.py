"""A readable basis of a space of conserved operators.

Sought are few strings per operator, ranges as short as possible, ket and bra apart, and a definite
weight under the diagonal charges. Reduced echelon forms do all of this: a vector that is zero at
every pivot but its own is the only one of its kind, so that it has a definite weight whenever the
space has a basis of such vectors, and operators of a subspace (the ket alone) are found by letting
the pivots of the rest come first.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from lbwork.integrability.commutators import digits_of, string_ranges
from lbwork.integrability.string_vectors import StringVectors
from lbwork.integrability.strings import StringBasis

__all__ = ["CleanVector", "clean_basis"]

_NOISE = 1e-12
"""Coefficients of a finished vector below this times its largest are rounding errors."""

_ZERO = 1e-9
"""Coefficients below this, relative to the largest of an orthonormal basis, are zero."""


@dataclass(frozen=True, eq=False)
class CleanVector:
    """One operator: ``codes`` over the width of its family, ``values`` with pivot 1, in terms of
    the named on-site operators. ``length``: its range. ``side``: 1 ket, 2 bra, 3 both. ``name``:
    empty unless it was asked for by name.
    """

    codes: np.ndarray
    values: np.ndarray
    length: int
    side: int
    name: str = ""


def _string_sides(codes: np.ndarray, basis: StringBasis, width: int) -> np.ndarray:
    """1 for strings on the ket alone, 2 on the bra alone, 3 for others."""
    sides = basis.sides[digits_of(codes, basis.size, width)]
    return np.asarray(np.bitwise_or.reduce(sides, axis=1))


def _reduced_echelon(vectors: np.ndarray, classes: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Rows in reduced echelon form, and their pivots; classes of columns in ascending order.

    Within a class the largest remaining column is taken, the first among nearly equal ones.
    """
    rows = np.linalg.qr(vectors)[0].T.copy()
    order = np.unique(classes)
    pivots: list[int] = []
    done = 0
    for label in order:
        members = np.flatnonzero(classes == label)
        while done < rows.shape[0]:
            sizes = np.linalg.norm(rows[done:, members], axis=0)
            if sizes.max(initial=0.0) < _ZERO**0.5:
                break
            chosen = int(members[np.flatnonzero(sizes > 0.9 * sizes.max())[0]])
            # A reflection brings the whole column into one row: as stable as a QR factorisation.
            column = rows[done:, chosen]
            target = np.linalg.norm(column)
            mirror = column.astype(complex)
            phase = column[0] / abs(column[0]) if abs(column[0]) > 0 else 1.0
            mirror[0] += phase * target
            mirror /= np.linalg.norm(mirror)
            rows[done:] -= 2 * np.outer(mirror, mirror.conj() @ rows[done:])
            pivots.append(chosen)
            done += 1
    found = np.array(pivots, dtype=np.int64)
    reduced = np.linalg.solve(rows[:done][:, found], rows[:done]) if done else rows[:0]
    return reduced, found


def _subspace(vectors: np.ndarray, outside: np.ndarray) -> np.ndarray:
    """Combinations of the columns that vanish on the rows ``outside``."""
    if vectors.shape[1] == 0 or not outside.any():
        return vectors
    part = vectors[outside]
    if part.shape[0] > part.shape[1]:
        part = np.linalg.qr(part, mode="r")
    _, singular, right = np.linalg.svd(part, full_matrices=True)
    rank = int(np.sum(singular > _ZERO * max(float(singular.max(initial=0.0)), 1.0)))
    return np.asarray(vectors @ right[rank:].conj().T)


def _rank(vectors: list[np.ndarray]) -> int:
    if not vectors:
        return 0
    matrix = np.array([vector / np.linalg.norm(vector) for vector in vectors])
    return int(np.linalg.matrix_rank(matrix, tol=1e-7))


def clean_basis(
    spaces: list[StringVectors], basis: StringBasis, named: list[tuple[str, StringVectors]]
) -> list[CleanVector]:
    """Basis of the last of a growing sequence of spaces, of range up to 1, 2, ...

    ``spaces[k]`` holds the operators of range up to k + 1 over that many sites. ``named``:
    candidates of one column over as many sites as their range, used where they are new members of
    the space.
    """
    chosen: list[CleanVector] = []
    for length, space in enumerate(spaces, start=1):
        if space.columns == 0:
            continue
        chosen += _new_vectors(space, length, basis, named, chosen)
    return chosen


def _new_vectors(
    space: StringVectors,
    length: int,
    basis: StringBasis,
    named: list[tuple[str, StringVectors]],
    known: list[CleanVector],
) -> list[CleanVector]:
    codes, vectors = space.codes, np.linalg.qr(space.values.toarray())[0]
    sides = _string_sides(codes, basis, length)
    ranges = string_ranges(codes, basis.size, length)
    top = ranges == length
    factors = basis.factors[digits_of(codes, basis.size, length)].prod(axis=1)
    missing = space.columns - len(known)
    leading: list[np.ndarray] = []
    found: list[CleanVector] = []

    def offered(vector: np.ndarray, side: int, name: str) -> None:
        """Take a vector whose leading part is new."""
        if len(found) == missing:
            return
        part = vector[top]
        if np.linalg.norm(part) < 1e-7 * np.linalg.norm(vector):
            return
        if _rank([*leading, part]) == len(leading):
            return
        leading.append(part)
        found.append(_named_vector(codes, vector, factors, length, side, name))

    for side in (1, 2, 3):
        inside = _subspace(vectors, (sides & ~side) > 0) if basis.doubled or side == 3 else None
        if inside is None or inside.shape[1] == 0:
            continue
        for name, candidate in named:
            vector = candidate.widened(length) if candidate.width <= length else None
            if vector is None or candidate.width != length:
                continue
            dense = vector.dense(codes)[:, 0]
            size = float(vector.norms[0])
            rest = dense - inside @ np.linalg.lstsq(inside, dense, rcond=None)[0]
            if size > 0 and abs(np.linalg.norm(dense) - size) + np.linalg.norm(rest) < 1e-8 * size:
                offered(dense, side, name)
        # Longest strings first; among them those that mix ket and bra.
        classes = 4 * (length - ranges) + (3 - sides)
        reduced, _ = _reduced_echelon(inside, classes)
        for row in reduced:
            offered(row, side, "")
    return found


def _named_vector(
    codes: np.ndarray,
    vector: np.ndarray,
    factors: np.ndarray,
    length: int,
    side: int,
    name: str,
) -> CleanVector:
    """Coefficients of the named on-site operators, the first of the largest ones set to 1."""
    values = vector / factors
    size = float(np.abs(values).max())
    kept = np.abs(values) > _NOISE * size
    codes, values = codes[kept], values[kept]
    first = int(np.flatnonzero(np.abs(values) > 0.999 * size)[0])
    values = values / values[first]
    return CleanVector(codes, values, length, side, name)
