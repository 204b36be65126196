"""The canonical form of a model: what it is, however it was written.

H is expanded in products of an orthonormal Hermitian on-site basis that contains the identity;
products are trimmed to the sites on which they act and added up, so the way a Hamiltonian is cut
into terms does not matter. Each jump ``sqrt(rate) l`` is expanded alike and its global phase fixed.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import lru_cache
from typing import Any, Protocol

import numpy as np

__all__ = ["canonical_document", "hermiticity_defect", "on_site_basis"]

SIGNIFICANT_DIGITS = 12

String = tuple[tuple[int, int], ...]


class _Placed(Protocol):
    @property
    def sites(self) -> tuple[int, ...]: ...

    @property
    def matrix(self) -> np.ndarray: ...


class _PlacedJump(_Placed, Protocol):
    @property
    def rate(self) -> float: ...


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
    return np.array(elements)


def _coefficients(matrix: np.ndarray, dimension: int, count: int) -> np.ndarray:
    """Expansion coefficients ``tr(G^dag M)/d**k``: complex, shape (d**2,) * k."""
    basis = on_site_basis(dimension)
    tensor = matrix.reshape((dimension,) * (2 * count))
    for position in range(count):
        # contract row and column index of the first remaining site, append the basis index
        rows_left = count - position
        tensor = np.tensordot(tensor, basis.conj(), axes=([0, rows_left], [1, 2]))
    return np.asarray(tensor / dimension**count)


def _strings(placed: _Placed, dimension: int) -> dict[String, complex]:
    count = len(placed.sites)
    coefficients = _coefficients(placed.matrix, dimension, count)
    threshold = 1e-15 * np.abs(coefficients).max()
    found: dict[String, complex] = {}
    for index in np.argwhere(np.abs(coefficients) > threshold):
        pairs = sorted(
            (site, int(kind)) for site, kind in zip(placed.sites, index, strict=True) if kind
        )
        found[tuple(pairs)] = complex(coefficients[tuple(index)])
    return found


def _total(operators: Sequence[_Placed], dimension: int) -> dict[String, complex]:
    total: dict[String, complex] = {}
    for placed in operators:
        for string, value in _strings(placed, dimension).items():
            total[string] = total.get(string, 0) + value
    return total


def hermiticity_defect(
    operators: Sequence[_Placed], dimension: int
) -> tuple[float, tuple[int, ...]]:
    """Largest imaginary coefficient of H relative to the largest one, and the sites it acts on."""
    total = _total(operators, dimension)
    scale = max((abs(value) for value in total.values()), default=0.0)
    if scale == 0:
        return 0.0, ()
    worst = max(total, key=lambda string: abs(total[string].imag))
    return abs(total[worst].imag) / scale, tuple(site for site, _ in worst)


def _rounded(value: float, scale: float) -> float:
    if abs(value) < 10.0**-SIGNIFICANT_DIGITS * scale:
        return 0.0
    return float(f"{value:.{SIGNIFICANT_DIGITS}g}")


def _jump_entries(jump: _PlacedJump, dimension: int) -> list[list[Any]]:
    strings = {
        string: np.sqrt(jump.rate) * value for string, value in _strings(jump, dimension).items()
    }
    if not strings:
        return []
    scale = max(abs(value) for value in strings.values())
    leader = min(string for string, value in strings.items() if abs(value) > (1 - 1e-9) * scale)
    phase = strings[leader].conjugate() / abs(strings[leader])
    entries = []
    for string, value in sorted(strings.items()):
        turned = value * phase
        real, imaginary = _rounded(turned.real, scale), _rounded(turned.imag, scale)
        if real or imaginary:
            entries.append([[list(pair) for pair in string], real, imaginary])
    return entries


def canonical_document(
    sites: int,
    dimension: int,
    boundary: str,
    operators: Sequence[_Placed],
    jumps: Sequence[_PlacedJump],
) -> dict[str, Any]:
    """JSON document that is the same for every way of writing the same model.

    Sites are 1-based; an operator string is a list of (site, basis index) pairs. Jumps keep their
    own identity: unitary mixing of different jumps is not undone. Jumps proportional to the
    identity have no effect and are dropped, as is the constant of H. Open and periodic chains with
    the same terms remain different models, since symmetries and bonds are read off the boundary.
    """
    total = _total(operators, dimension)
    scale = max((abs(value) for string, value in total.items() if string), default=0.0)
    hamiltonian = [
        [[[site + 1, kind] for site, kind in string], _rounded(value.real, scale)]
        for string, value in sorted(total.items())
        if string and _rounded(value.real, scale)
    ]
    listed = [_jump_entries(jump, dimension) for jump in jumps]
    jump_documents = sorted(
        [[[[site + 1, kind] for site, kind in pairs], real, imag] for pairs, real, imag in entries]
        for entries in listed
        if any(pairs for pairs, _, _ in entries)
    )
    return {
        "sites": sites,
        "local_dimension": dimension,
        "boundary": boundary,
        "hamiltonian": hamiltonian,
        "jumps": jump_documents,
    }
