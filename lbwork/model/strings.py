"""Expansion of local operators in strings: products of an orthonormal Hermitian on-site basis.

A string lists the sites on which it differs from the identity, so that the same operator written on
more sites than it needs has the same strings.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from functools import lru_cache
from typing import Protocol

import numpy as np

__all__ = ["Placed", "String", "on_site_basis", "operator_strings", "total_strings"]

String = tuple[tuple[int, int], ...]
"""Pairs (0-based site, index of the basis element 1..d**2-1), sorted by site."""

NEGLIGIBLE = 1e-15
"""Coefficients below this times the largest one of their operator are rounding errors."""

Expansion = tuple[list[list[int]], list[complex]]


class Placed(Protocol):
    """Anything with 0-based ``sites`` and a complex (d**k, d**k) ``matrix``."""

    @property
    def sites(self) -> tuple[int, ...]:
        """Sites in tensor order."""

    @property
    def matrix(self) -> np.ndarray:
        """The operator on these sites."""


@lru_cache(maxsize=16)
def on_site_basis(dimension: int) -> np.ndarray:
    """Hermitian basis ``tr(g_a g_b) = d delta_ab`` with ``g_0 = 1``: complex (d**2, d, d)."""
    elements = [np.eye(dimension, dtype=complex)]
    scale = np.sqrt(dimension / 2)
    for row in range(dimension):
        for column in range(row + 1, dimension):
            real = np.zeros((dimension, dimension), dtype=complex)
            real[row, column] = real[column, row] = scale
            imaginary = np.zeros((dimension, dimension), dtype=complex)
            imaginary[row, column], imaginary[column, row] = -1j * scale, 1j * scale
            elements += [real, imaginary]
    for level in range(1, dimension):
        diagonal = np.zeros(dimension)
        diagonal[:level] = 1
        diagonal[level] = -level
        elements.append(
            np.diag(diagonal * np.sqrt(dimension / (level * (level + 1)))).astype(complex)
        )
    basis = np.array(elements)
    basis.setflags(write=False)
    return basis


def _expansion(matrix: np.ndarray, dimension: int) -> Expansion:
    """Basis indices per site and coefficients ``tr(G^dag M)/d**k`` of the strings in a matrix."""
    basis = on_site_basis(dimension)
    count = round(np.log(matrix.shape[0]) / np.log(dimension))
    tensor = matrix.reshape((dimension,) * (2 * count))
    for position in range(count):
        # Contract row and column index of the first remaining site, append the basis index.
        rows_left = count - position
        tensor = np.tensordot(tensor, basis.conj(), axes=([0, rows_left], [1, 2]))
    coefficients = tensor / dimension**count
    present = np.abs(coefficients) > NEGLIGIBLE * np.abs(coefficients).max()
    return np.argwhere(present).tolist(), coefficients[present].tolist()


def operator_strings(
    operators: Iterable[Placed], dimension: int
) -> Iterator[tuple[Placed, dict[String, complex]]]:
    """Each placed operator with its strings; matrices shared between places are expanded once."""
    known: dict[int, Expansion] = {}
    for placed in operators:
        key = id(placed.matrix)
        if key not in known:
            known[key] = _expansion(placed.matrix, dimension)
        kinds, coefficients = known[key]
        order = sorted(range(len(placed.sites)), key=placed.sites.__getitem__)
        steps = [(position, placed.sites[position]) for position in order]
        yield (
            placed,
            {
                tuple((site, row[position]) for position, site in steps if row[position]): value
                for row, value in zip(kinds, coefficients, strict=True)
            },
        )


def total_strings(operators: Iterable[Placed], dimension: int) -> Mapping[String, complex]:
    """Strings of a sum of operators, overlapping ones added up."""
    total: dict[String, complex] = {}
    for _, strings in operator_strings(operators, dimension):
        for string, value in strings.items():
            total[string] = total.get(string, 0) + value
    return total
