"""Local expectation values of a density matrix by partial traces."""

from __future__ import annotations

import numpy as np

__all__ = [
    "connected_correlations",
    "expectation",
    "local_magnetisation",
    "magnetisation_profile",
    "reduced_density",
    "spectrum_quantities",
    "spin_operators",
    "spin_profile",
    "weight_quantities",
    "zz_correlations",
]


def local_magnetisation(dimension: int) -> np.ndarray:
    """Diagonal of ``2 S^z`` (sigma^z for d = 2), highest state first, float64 (d,)."""
    return np.arange(dimension - 1, -dimension, -2, dtype=float)


def reduced_density(
    density: np.ndarray, sites: tuple[int, ...], count: int, dimension: int
) -> np.ndarray:
    """Partial trace of (D, D) onto ``sites`` (0-based, any order), complex (d^k, d^k)."""
    tensor = density.reshape((dimension,) * (2 * count))
    ket = list(range(count))
    bra = [count + site if site in sites else site for site in range(count)]
    kept = [*sites, *(count + site for site in sites)]
    reduced = np.einsum(tensor, [*ket, *bra], kept, optimize=False)
    return np.asarray(reduced.reshape((dimension ** len(sites),) * 2))


def _populations(density: np.ndarray, count: int, dimension: int) -> np.ndarray:
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
    """``2 S^x``, ``2 S^y``, ``2 S^z`` of spin (d-1)/2 by name x, y, z; Pauli matrices for d = 2."""
    spin = (dimension - 1) / 2
    projections = spin - np.arange(dimension)
    raising = np.diag(np.sqrt(spin * (spin + 1) - projections[1:] * (projections[1:] + 1)), 1)
    return {
        "x": (raising + raising.T).astype(complex),
        "y": -1j * (raising - raising.T),
        "z": np.diag(2 * projections).astype(complex),
    }


def expectation(
    density: np.ndarray, operator: np.ndarray, sites: tuple[int, ...], count: int, dimension: int
) -> complex:
    """``tr(rho A)`` of an operator (d**k, d**k) on 0-based ``sites`` in tensor order."""
    local = reduced_density(density, sites, count, dimension)
    return complex(np.sum(local * operator.T))


def spin_profile(density: np.ndarray, count: int, dimension: int) -> np.ndarray:
    """``<2 S^a_j>`` for a = x, y, z, float64 (3, L)."""
    operators = spin_operators(dimension)
    profile = np.zeros((3, count))
    for site in range(count):
        local = reduced_density(density, (site,), count, dimension)
        for row, operator in enumerate(operators.values()):
            profile[row, site] = float(np.sum(local * operator.T).real)
    return profile


def connected_correlations(
    density: np.ndarray, first: np.ndarray, second: np.ndarray, count: int, dimension: int
) -> np.ndarray:
    """``<A_i B_j> - <A_i><B_j>`` of one-site operators (d, d), complex (L, L); i = j: <A B>."""
    locals_ = [reduced_density(density, (site,), count, dimension) for site in range(count)]
    means = np.array(
        [[complex(np.sum(one * operator.T)) for one in locals_] for operator in (first, second)]
    )
    result = -np.outer(means[0], means[1])
    for site in range(count):
        result[site, site] += np.sum(locals_[site] * (first @ second).T)
        for other in range(site + 1, count):
            pair = reduced_density(density, (site, other), count, dimension)
            result[site, other] += np.sum(pair * np.kron(first, second).T)
            result[other, site] += np.sum(pair * np.kron(second, first).T)
    return result


def weight_quantities(weights: np.ndarray) -> tuple[float, float, float]:
    """Smallest one, ``sum w^2`` and ``-sum w ln w`` of a density matrix's eigenvalues."""
    positive = weights[weights > 0]
    entropy = -float(np.sum(positive * np.log(positive)))
    return float(weights.min()), float(np.sum(weights**2)), max(entropy, 0.0)


def spectrum_quantities(density: np.ndarray) -> tuple[float, float, float]:
    """Smallest eigenvalue, purity ``tr rho^2`` and von Neumann entropy (natural logarithm)."""
    return weight_quantities(np.linalg.eigvalsh(density))
