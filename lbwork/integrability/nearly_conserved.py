"""Operators that are almost conserved: small singular values of the commutator map.

The map takes canonical coefficients of an operator of range up to r to those of its commutator with
the density of norm one. A singular value s belongs to an operator with ``||[Q, A]|| = s ||A||``; at
weak breaking of an integrable chain, it is of the order of the perturbation for what was a charge.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.linalg
import scipy.sparse as sparse

from lbwork import defaults
from lbwork.errors import CapacityError, UsageError
from lbwork.integrability.commutators import commutator
from lbwork.integrability.density import LocalDensity, local_density
from lbwork.integrability.least_squares import check_part, components, dense_block, spectral_bound
from lbwork.integrability.string_vectors import StringVectors
from lbwork.model import Model

__all__ = ["NearlyConserved", "nearly_conserved"]

_DIRECT = 500
_ROUNDS = 12


@dataclass(frozen=True, eq=False)
class NearlyConserved:
    """The ``count`` smallest singular values of the commutator map that are not zero.

    ``exact``: number of conserved operators. ``values``: float64 (count,), ascending, relative to
    ``||q||``. ``operators``: the operators of norm one they belong to, one column each, in
    orthonormal strings over ``max_range`` sites.
    """

    density: LocalDensity
    max_range: int
    exact: int
    values: np.ndarray
    operators: StringVectors

    def below(self, threshold: float) -> int:
        """Number of listed values below a threshold."""
        return int(np.sum(self.values < threshold))

    def to_dict(self) -> dict[str, Any]:
        """A JSON document without the operators."""
        return {
            "density": str(self.density),
            "max_range": self.max_range,
            "exact": self.exact,
            "values": [float(value) for value in self.values],
        }

    def __str__(self) -> str:
        listed = ", ".join(f"{value:.3g}" for value in self.values)
        return (
            f"nearly conserved operators of range up to {self.max_range}, {self.density}: "
            f"{self.exact} conserved, then {listed}"
        )


def nearly_conserved(
    source: Model | LocalDensity | np.ndarray,
    *,
    max_range: int = 3,
    count: int = 6,
    doubled: bool | None = None,
) -> NearlyConserved:
    """Smallest singular values of ``A -> [Q, A] / ||q||`` on operators up to ``max_range`` sites.

    The norm is that of canonical coefficients, ``lim ||A||**2 / length`` on a long chain. Errors as
    in :func:`lbwork.integrability.density.local_density`; UsageError for a bad range or count;
    CapacityError when a decoupled part is too large.
    """
    density = local_density(source, doubled=doubled)
    for word, value in (("max_range", max_range), ("count", count)):
        if isinstance(value, bool) or not isinstance(value, int) or value < 1:
            raise UsageError(f"{word} = {value!r} is not one of 1, 2, ...; give such a number")
    base = density.basis.size
    if (base - 1) * float(base) ** (max_range - 1) > defaults.CHARGES_NEAR_STRINGS:
        raise CapacityError(
            f"range {max_range} has over {defaults.CHARGES_NEAR_STRINGS:.2g} strings of {base} "
            "operators per site; ask for a shorter range"
        )
    codes = np.arange(base ** (max_range - 1), base**max_range)
    _, matrix = commutator(density.table, codes, max_range)
    bound = spectral_bound(matrix)
    found: list[tuple[float, np.ndarray, np.ndarray]] = []
    exact = 0
    for rows, columns in components(matrix):
        values, vectors = _smallest(matrix, rows, columns, count, bound)
        zero = values <= defaults.CHARGES_TOLERANCE * bound
        exact += int(zero.sum())
        found += [
            (float(value), columns, vectors[:, index])
            for index, value in enumerate(values)
            if not zero[index]
        ]
    found.sort(key=lambda entry: entry[0])
    found = found[:count]
    nothing = np.zeros(0, dtype=np.int64)
    operators = StringVectors.summed(
        base,
        max_range,
        codes[np.concatenate([columns for _, columns, _ in found] or [nothing])],
        np.repeat(np.arange(len(found)), [columns.size for _, columns, _ in found]),
        np.concatenate([vector for _, _, vector in found] or [nothing]),
        len(found),
    )
    return NearlyConserved(
        density, max_range, exact, np.array([value for value, _, _ in found]), operators
    )


def _smallest(
    matrix: sparse.csc_matrix, rows: np.ndarray, columns: np.ndarray, count: int, bound: float
) -> tuple[np.ndarray, np.ndarray]:
    """Smallest singular values of a decoupled part, zeros and at least ``count`` others."""
    if rows.size == 0:
        return np.zeros(columns.size), np.eye(columns.size)
    if columns.size <= _DIRECT:
        check_part(rows, columns)
        block = dense_block(matrix, rows, columns)
        if rows.size > columns.size:
            block = np.asarray(np.linalg.qr(block, mode="r"))
        _, singular, right = np.linalg.svd(block, full_matrices=True)
        values = np.zeros(columns.size)
        values[: singular.size] = singular
        return values[::-1], right.conj().T[:, ::-1]
    if columns.size > defaults.CHARGES_NEAR_PART:
        raise CapacityError(
            f"a part with {columns.size} strings does not decouple, at most "
            f"{defaults.CHARGES_NEAR_PART} are treated; ask for a shorter range"
        )
    part = matrix[:, columns]
    size = min(2 * count + 8, columns.size)
    while True:
        values, vectors = _iterated(part, size, bound)
        zeros = int(np.sum(values <= defaults.CHARGES_TOLERANCE * bound))
        if zeros + count <= size // 2 or size == columns.size:
            # Only the lower half of the iterated block has converged.
            kept = zeros + count
            return values[:kept], vectors[:, :kept]
        size = min(2 * size, columns.size)


def _iterated(part: sparse.csc_matrix, size: int, bound: float) -> tuple[np.ndarray, np.ndarray]:
    """Inverse iteration with ``A^dag A``; values from the tall product, never from the square."""
    gram = (part.conj().T @ part).toarray()
    gram[np.diag_indices_from(gram)] += 1e-13 * bound**2
    factor = scipy.linalg.cho_factor(gram, lower=True, overwrite_a=True, check_finite=False)
    block = np.random.default_rng(1).normal(size=(part.shape[1], size)).astype(complex)
    for _ in range(_ROUNDS):
        block = np.linalg.qr(scipy.linalg.cho_solve(factor, block, check_finite=False))[0]
    triangle = np.linalg.qr(part @ block, mode="r")
    _, singular, right = np.linalg.svd(triangle)
    return singular[::-1], block @ right.conj().T[:, ::-1]
