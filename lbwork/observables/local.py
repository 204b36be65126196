"""Local expectation values of a density matrix by partial traces.

Only reduced density matrices are formed. A partial trace onto k sites reads D d**k entries of the
matrix where they lie and copies nothing, whatever its memory order.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from lbwork.errors import UsageError

__all__ = [
    "connected_correlations",
    "expectation",
    "local_magnetisation",
    "magnetisation_profile",
    "reduced_density",
    "require_state_shape",
    "spectrum_quantities",
    "spin_correlations",
    "spin_operators",
    "spin_profile",
    "weight_quantities",
    "zz_correlations",
]


def local_magnetisation(dimension: int) -> np.ndarray:
    """Diagonal of ``2 S^z`` (sigma^z for d = 2), highest state first, float64 (d,)."""
    return np.arange(dimension - 1, -dimension, -2, dtype=float)


def require_state_shape(density: np.ndarray, count: int, dimension: int) -> None:
    """UsageError unless ``density`` is (D, D) with D = d**L."""
    size = dimension**count
    if np.shape(density) != (size, size):
        raise UsageError(
            f"an array of shape {np.shape(density)} is not a state of {count} sites of dimension "
            f"{dimension}; it must be ({size}, {size})"
        )


def reduced_density(
    density: np.ndarray, sites: Sequence[int], count: int, dimension: int
) -> np.ndarray:
    """Partial trace of (D, D) onto ``sites`` (0-based, any order), (d^k, d^k).

    The factors of the result stand in the order of ``sites``; its type is that of ``density``,
    which is not copied. Raises UsageError for sites that repeat or are not on the chain, and for
    another shape than (d**L, d**L).
    """
    require_state_shape(density, count, dimension)
    places = [int(site) for site in sites]
    if len(set(places)) != len(places) or not all(0 <= site < count for site in places):
        names = ", ".join(str(site + 1) for site in places)
        raise UsageError(f"sites {names}: they must differ and lie in 1..{count}")
    # Neighbours that are traced out together stay one factor: few axes, long inner loops.
    shape: list[int] = []
    factors: dict[int, int] = {}
    joined = False
    for site in range(count):
        if site in places:
            factors[site] = len(shape)
            shape.append(dimension)
            joined = False
        elif joined:
            shape[-1] *= dimension
        else:
            shape.append(dimension)
            joined = True
    kept = set(factors.values())
    width = len(shape)
    bra = [width + factor if factor in kept else factor for factor in range(width)]
    order = [factors[site] for site in places]
    reduced = np.einsum(
        density.reshape(shape + shape),
        [*range(width), *bra],
        [*order, *(width + factor for factor in order)],
    )
    return np.asarray(reduced.reshape((dimension ** len(places),) * 2))


def _populations(density: np.ndarray, count: int, dimension: int) -> np.ndarray:
    require_state_shape(density, count, dimension)
    return np.asarray(np.diagonal(density).real.reshape((dimension,) * count))


def magnetisation_profile(density: np.ndarray, count: int, dimension: int) -> np.ndarray:
    """``<sigma^z_j>`` (``<2 S^z_j>`` for d > 2), float64 (L,)."""
    populations = _populations(density, count, dimension)
    values = local_magnetisation(dimension)
    return np.array(
        [
            populations.sum(axis=tuple(other for other in range(count) if other != site)) @ values
            for site in range(count)
        ]
    )


def zz_correlations(density: np.ndarray, count: int, dimension: int) -> np.ndarray:
    """``<m_i m_j> - <m_i><m_j>`` of the magnetisation, float64 (L, L); diagonal: variances."""
    populations = _populations(density, count, dimension).ravel()
    values = local_magnetisation(dimension)
    states = np.arange(populations.size)
    columns = np.empty((populations.size, count))
    for site in range(count):
        columns[:, site] = values[states // dimension ** (count - 1 - site) % dimension]
    means = populations @ columns
    return np.asarray(columns.T @ (populations[:, None] * columns) - np.outer(means, means))


def spin_operators(dimension: int) -> dict[str, np.ndarray]:
    """``2 S^x``, ``2 S^y``, ``2 S^z`` of spin (d-1)/2 by name x, y, z; Pauli matrices for d = 2.

    complex (d, d), highest state first; ``[2S^x, 2S^y] = 2i 2S^z``.
    """
    spin = (dimension - 1) / 2
    projections = spin - np.arange(dimension)
    raising = np.diag(np.sqrt(spin * (spin + 1) - projections[1:] * (projections[1:] + 1)), 1)
    return {
        "x": (raising + raising.T).astype(complex),
        "y": -1j * (raising - raising.T),
        "z": np.diag(2 * projections).astype(complex),
    }


def _checked_operator(operator: np.ndarray, width: int, dimension: int) -> np.ndarray:
    matrix = np.asarray(operator)
    size = dimension**width
    if matrix.shape != (size, size):
        raise UsageError(
            f"an operator of shape {matrix.shape} does not act on {width} site(s) of dimension "
            f"{dimension}; it must be ({size}, {size})"
        )
    return matrix


def expectation(
    density: np.ndarray, operator: np.ndarray, sites: Sequence[int], count: int, dimension: int
) -> complex:
    """``tr(rho A)`` of an operator (d**k, d**k) on 0-based ``sites`` in tensor order.

    The sites need not be neighbours nor in order. Raises UsageError where the operator, the state
    or the sites do not fit each other.
    """
    matrix = _checked_operator(operator, len(sites), dimension)
    local = reduced_density(density, sites, count, dimension)
    return complex(np.sum(local * matrix.T))


def spin_profile(density: np.ndarray, count: int, dimension: int) -> np.ndarray:
    """``<2 S^a_j>`` for a = x, y, z, float64 (3, L)."""
    operators = spin_operators(dimension)
    profile = np.zeros((3, count))
    for site in range(count):
        local = reduced_density(density, (site,), count, dimension)
        for row, operator in enumerate(operators.values()):
            profile[row, site] = float(np.sum(local * operator.T).real)
    return profile


def _pair_correlations(
    density: np.ndarray,
    pairs: Sequence[tuple[np.ndarray, np.ndarray]],
    count: int,
    dimension: int,
) -> np.ndarray:
    """Connected correlations of several pairs of operators, complex (n, L, L)."""
    found = np.zeros((len(pairs), count, count), dtype=complex)
    singles = [reduced_density(density, (site,), count, dimension) for site in range(count)]
    for index, (first, second) in enumerate(pairs):
        one = [np.sum(local * first.T) for local in singles]
        two = [np.sum(local * second.T) for local in singles]
        found[index] = -np.outer(one, two)
        for site, local in enumerate(singles):
            found[index, site, site] += np.sum(local * (first @ second).T)
    for site in range(count):
        for other in range(site + 1, count):
            local = reduced_density(density, (site, other), count, dimension)
            for index, (first, second) in enumerate(pairs):
                found[index, site, other] += np.sum(local * np.kron(first, second).T)
                found[index, other, site] += np.sum(local * np.kron(second, first).T)
    return found


def connected_correlations(
    density: np.ndarray, first: np.ndarray, second: np.ndarray, count: int, dimension: int
) -> np.ndarray:
    """``<A_i B_j> - <A_i><B_j>`` of one-site operators (d, d), complex (L, L).

    On the diagonal the product is that of the matrices, in the order A B. The sum over all i and j
    is ``<A B> - <A><B>`` of the sums of A and of B over the chain.
    """
    pair = (_checked_operator(first, 1, dimension), _checked_operator(second, 1, dimension))
    return np.asarray(_pair_correlations(density, [pair], count, dimension)[0])


def spin_correlations(density: np.ndarray, count: int, dimension: int) -> np.ndarray:
    """``<m^a_i m^a_j> - <m^a_i><m^a_j>`` of ``m^a = 2 S^a``, a = x, y, z, float64 (3, L, L)."""
    pairs = [(operator, operator) for operator in spin_operators(dimension).values()]
    return np.asarray(_pair_correlations(density, pairs, count, dimension).real)


def weight_quantities(weights: np.ndarray) -> tuple[float, float, float]:
    """Smallest one, ``sum w^2`` and ``-sum w ln w`` of a density matrix's eigenvalues."""
    positive = weights[weights > 0]
    entropy = -float(np.sum(positive * np.log(positive)))
    return float(weights.min()), float(np.sum(weights**2)), max(entropy, 0.0)


def spectrum_quantities(density: np.ndarray) -> tuple[float, float, float]:
    """Smallest eigenvalue, purity ``tr rho^2`` and von Neumann entropy (natural logarithm)."""
    return weight_quantities(np.linalg.eigvalsh(density))
