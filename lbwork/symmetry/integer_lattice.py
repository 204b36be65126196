"""Abelian groups from integer relations: the Smith normal form with its column transformation."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

__all__ = ["QuotientGroup", "quotient_group"]


@dataclass(frozen=True)
class QuotientGroup:
    """``Z**n`` modulo the span of some rows, as ``Z**r`` times cyclic groups.

    ``labels_of(x)`` is ``x @ transform`` restricted to the non-trivial columns; column ``i`` counts
    modulo ``moduli[i]``, where 0 stands for the integers.
    """

    transform: np.ndarray
    moduli: tuple[int, ...]


def _row_echelon(rows: np.ndarray) -> list[list[int]]:
    """At most n integer rows with the same span (Euclid's algorithm column by column)."""
    pending = [[int(entry) for entry in row] for row in rows]
    pending = [row for row in pending if any(row)]
    width = rows.shape[1]
    echelon: list[list[int]] = []
    for column in range(width):
        candidates = [row for row in pending if row[column]]
        pending = [row for row in pending if not row[column]]
        while len(candidates) > 1:
            candidates.sort(key=lambda row: abs(row[column]))
            pivot = candidates[0]
            reduced = [pivot]
            for row in candidates[1:]:
                factor = row[column] // pivot[column]
                rest = [a - factor * b for a, b in zip(row, pivot, strict=True)]
                if rest[column]:
                    reduced.append(rest)
                elif any(rest):
                    pending.append(rest)
            candidates = reduced
        echelon.extend(candidates)
    return echelon


def quotient_group(rows: np.ndarray) -> QuotientGroup:
    """Smith normal form of the relations ``rows`` (m, n) of ``Z**n``.

    Exact integer arithmetic. Returns the isomorphism ``Z**n / span(rows) -> prod Z_{moduli}``.
    """
    width = rows.shape[1]
    matrix = _row_echelon(np.unique(rows, axis=0)) if rows.size else []
    transform = [[int(i == j) for j in range(width)] for i in range(width)]
    height = len(matrix)
    step = 0
    diagonal: list[int] = []
    while step < min(height, width):
        entries = [
            (abs(matrix[i][j]), i, j)
            for i in range(step, height)
            for j in range(step, width)
            if matrix[i][j]
        ]
        if not entries:
            break
        _, pivot_row, pivot_column = min(entries)
        matrix[step], matrix[pivot_row] = matrix[pivot_row], matrix[step]
        for row in (*matrix, *transform):
            row[step], row[pivot_column] = row[pivot_column], row[step]
        pivot = matrix[step][step]
        clean = True
        for i in range(step + 1, height):
            factor = matrix[i][step] // pivot
            if factor:
                matrix[i] = [a - factor * b for a, b in zip(matrix[i], matrix[step], strict=True)]
            clean = clean and not matrix[i][step]
        for j in range(step + 1, width):
            factor = matrix[step][j] // pivot
            if factor:
                for row in (*matrix, *transform):
                    row[j] -= factor * row[step]
            clean = clean and not matrix[step][j]
        if clean:
            diagonal.append(abs(pivot))
            step += 1
    kept = [index for index, entry in enumerate(diagonal) if entry != 1]
    kept += list(range(len(diagonal), width))
    moduli = [diagonal[index] if index < len(diagonal) else 0 for index in kept]
    columns = np.array(transform, dtype=np.int64).reshape(width, width)[:, kept]
    return QuotientGroup(columns, tuple(moduli))
