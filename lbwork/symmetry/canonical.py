"""The generator as a unique sum over supports, so that two generators can be compared term by term.

A chain superoperator can be cut into local terms in many ways (a field may sit on sites or be
shared by bonds). Here it becomes ``L = c 1 + sum_A M_A`` with ``A`` a sorted tuple of sites and
``tr_j M_A = 0`` for every site ``j`` of ``A``. This decomposition is unique, hence two generators
are equal exactly when all their ``M_A`` are.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterable, Mapping

import numpy as np

from lbwork.generator import SuperTerm

__all__ = [
    "CanonicalTerms",
    "canonical_terms",
    "local_digits",
    "permute_sites",
    "sublattice_count",
    "terms_norm",
]

CanonicalTerms = Mapping[tuple[int, ...], np.ndarray]
"""Support (sorted 0-based sites) -> complex128 matrix of shape (q**k, q**k), q = d**2."""

NEGLIGIBLE = 1e-13


def local_digits(base: int, count: int) -> np.ndarray:
    """Digits of 0 .. base**count - 1, most significant first; int64 array (base**count, count)."""
    numbers = np.arange(base**count)
    powers = base ** np.arange(count - 1, -1, -1)
    return (numbers[:, None] // powers[None, :]) % base


def permute_sites(matrix: np.ndarray, base: int, order: Iterable[int]) -> np.ndarray:
    """Reorder the tensor factors of an operator: new factor ``i`` is old factor ``order[i]``."""
    order = list(order)
    count = len(order)
    if order == list(range(count)):
        return matrix
    tensor = matrix.reshape((base,) * (2 * count))
    tensor = tensor.transpose([*order, *(count + position for position in order)])
    return tensor.reshape(matrix.shape)


def _without_identity(tensor: np.ndarray, base: int, position: int, count: int) -> np.ndarray:
    """Remove the part of ``tensor`` that acts as the identity on one factor."""
    trace = np.trace(tensor, axis1=position, axis2=count + position) / base
    identity_part = np.multiply.outer(trace, np.eye(base))
    remaining = 2 * (count - 1)
    axes = list(range(remaining))
    axes.insert(position, remaining)
    axes.insert(count + position, remaining + 1)
    return np.asarray(tensor - identity_part.transpose(axes))


def support_parts(
    sites: tuple[int, ...], matrix: np.ndarray, base: int
) -> dict[tuple[int, ...], np.ndarray]:
    """Split one local operator into its parts by exact support (the empty support is left out)."""
    order = np.argsort(sites)
    ordered_sites = tuple(int(sites[position]) for position in order)
    count = len(sites)
    tensor = permute_sites(np.asarray(matrix), base, order).reshape((base,) * (2 * count))
    parts: dict[tuple[int, ...], np.ndarray] = {}
    for size in range(1, count + 1):
        for kept in itertools.combinations(range(count), size):
            part = tensor
            left = count
            for position in reversed(range(count)):
                if position not in kept:
                    part = np.trace(part, axis1=position, axis2=left + position) / base
                    left -= 1
            for position in range(size):
                part = _without_identity(part, base, position, size)
            support = tuple(ordered_sites[position] for position in kept)
            parts[support] = part.reshape(base**size, base**size)
    return parts


def canonical_terms(terms: Iterable[SuperTerm], base: int) -> dict[tuple[int, ...], np.ndarray]:
    """Unique decomposition of a sum of local superoperators, ``base`` = d**2 states per site.

    Parts whose largest entry is below 1e-13 of the largest entry overall are dropped.
    """
    total: dict[tuple[int, ...], np.ndarray] = {}
    cache: dict[tuple[bytes, tuple[int, ...]], dict[tuple[int, ...], np.ndarray]] = {}
    for term in terms:
        order = tuple(int(position) for position in np.argsort(term.sites))
        key = (np.ascontiguousarray(term.matrix).tobytes(), order)
        slots = tuple(int(rank) for rank in np.argsort(order))
        if key not in cache:
            cache[key] = support_parts(slots, term.matrix, base)
        ordered = sorted(term.sites)
        for slot_support, matrix in cache[key].items():
            support = tuple(ordered[slot] for slot in slot_support)
            total[support] = total[support] + matrix if support in total else matrix
    scale = max((float(np.abs(matrix).max()) for matrix in total.values()), default=0.0)
    return {
        support: matrix
        for support, matrix in sorted(total.items())
        if np.abs(matrix).max() > NEGLIGIBLE * scale
    }


def sublattice_count(sites: int, ring: bool) -> int:
    """How many sublattices (odd, even sites) a chain has: 1 for one site or an odd ring, else 2."""
    return 1 if sites == 1 or (ring and sites % 2) else 2


def terms_norm(terms: CanonicalTerms) -> float:
    """Frobenius norm of the sum over the square root of the dimension of the whole space.

    Parts with different supports are orthogonal, so their squares add up.
    """
    return float(
        np.sqrt(sum(np.linalg.norm(matrix) ** 2 / matrix.shape[0] for matrix in terms.values()))
    )
