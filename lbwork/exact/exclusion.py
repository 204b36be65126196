"""The stationary state of the open totally asymmetric exclusion process at any finite size.

Particles hop to the right at rate 1 when the next site is empty, enter an empty site 1 at rate
``entry`` and leave site N at rate ``exit_rate``: jumps ``S- S+`` on every bond, ``S+`` on the first
and ``S-`` on the last site. B. Derrida, M. Evans, V. Hakim, V. Pasquier, J. Phys. A 26, 1493
(1993). All sums have positive terms, so that nothing cancels: equal rates need no limit, since

    (b^(p+1) - a^(p+1)) / (b - a) = sum_{q=0}^{p} a^q b^(p-q),   a = 1/entry, b = 1/exit_rate.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy.special import gammaln, logsumexp

from lbwork.exact.arguments import checked_count, checked_rate

__all__ = [
    "ExclusionPhase",
    "exclusion_current",
    "exclusion_phase",
    "exclusion_profile",
    "log_partition",
    "unit_rate_profile",
]

MAX_SITES = 20_000
"""The profile costs N^2 operations and a current N."""


@dataclass(frozen=True)
class ExclusionPhase:
    """Phase of the infinite open chain.

    name: ``low density``, ``high density``, ``maximal current`` or ``coexistence``. current:
    particles per time. densities: bulk density; both of them on the coexistence line.
    """

    name: str
    current: float
    densities: tuple[float, ...]


def exclusion_phase(entry: float, exit_rate: float) -> ExclusionPhase:
    """Phase for given boundary rates (> 0) in the limit of a long chain.

    Low density ``entry < exit_rate, 1/2``: density ``entry``; high density ``exit_rate < entry,
    1/2``: density ``1 - exit_rate``; otherwise maximal current 1/4 at density 1/2. Equal rates
    below 1/2 are the coexistence line. Raises ModelError. Derrida et al. (1993).
    """
    left, right = checked_rate("entry", entry), checked_rate("exit_rate", exit_rate)
    if min(left, right) >= 0.5:
        return ExclusionPhase("maximal current", 0.25, (0.5,))
    current = min(left, right) * (1 - min(left, right))
    if left == right:
        return ExclusionPhase("coexistence", current, (left, 1 - right))
    if left < right:
        return ExclusionPhase("low density", current, (left,))
    return ExclusionPhase("high density", current, (1 - right,))


def _log_symmetric(first: float, second: float, most: int) -> np.ndarray:
    """``log sum_{q=0}^{p} first^q second^(p-q)`` for p = 0..most, float64 (most + 1,)."""
    large, small = max(first, second), min(first, second)
    powers = np.arange(most + 1)
    return np.asarray(powers * np.log(large) + np.log(np.cumsum((small / large) ** powers)))


def _log_ballot(sites: int) -> np.ndarray:
    """``log [p (2N-1-p)! / (N! (N-p)!)]`` for p = 1..N, float64 (N,)."""
    p = np.arange(1, sites + 1)
    return np.asarray(
        np.log(p) + gammaln(2 * sites - p) - gammaln(sites + 1) - gammaln(sites - p + 1)
    )


def log_partition(sites: int, entry: float, exit_rate: float) -> npt.NDArray[np.float64]:
    """``log Z_n`` for n = 0..N, float64 (N + 1,); Z_n is the norm of the matrix product.

    ``Z_N = sum_{p=1}^{N} p (2N-1-p)! / (N! (N-p)!) sum_{q=0}^{p} a^q b^(p-q)``, ``Z_0 = 1``.
    Needs rates > 0 and N in 0..20000; raises ModelError, CapacityError. Derrida et al. (1993).
    """
    sites = checked_count("sites", sites, 0, MAX_SITES)
    left, right = checked_rate("entry", entry), checked_rate("exit_rate", exit_rate)
    symmetric = _log_symmetric(1 / left, 1 / right, sites)
    logs = [logsumexp(_log_ballot(n) + symmetric[1 : n + 1]) for n in range(1, sites + 1)]
    return np.array([0.0, *logs])


def exclusion_current(sites: int, entry: float, exit_rate: float) -> float:
    """Particle current ``Z_{N-1} / Z_N`` through N sites, exact to rounding for any N.

    The ratio is taken term by term as a mean with positive weights. Needs rates > 0 and N in
    1..20000; raises ModelError, CapacityError. Derrida et al. (1993).
    """
    sites = checked_count("sites", sites, 1, MAX_SITES)
    left, right = checked_rate("entry", entry), checked_rate("exit_rate", exit_rate)
    if sites == 1:
        return left * right / (left + right)
    p = np.arange(1, sites)
    logs = _log_ballot(sites) + _log_symmetric(1 / left, 1 / right, sites)[1:]
    weights = np.exp(logs - logs.max())
    ratios = sites * (sites - p) / ((2.0 * sites - 1 - p) * (2 * sites - 2 - p))
    return float(weights[:-1] @ ratios / weights.sum())


def exclusion_profile(sites: int, entry: float, exit_rate: float) -> npt.NDArray[np.float64]:
    """Occupations ``<n_i>``, i = 1..N, float64 (N,), for any boundary rates > 0.

    ``<n_i> = sum_{p=0}^{n-1} C_p Z_{N-1-p}/Z_N
    + Z_{i-1}/Z_N sum_{q=1}^{n} q (2n-1-q)! / (n! (n-q)!) b^(q+1)``
    with n = N - i and Catalan numbers C_p; the last sum is b for n = 0. Costs N^2.
    Raises ModelError, CapacityError. Derrida et al. (1993), from memory.
    """
    logs = log_partition(sites, entry, exit_rate)
    inverse = -np.log(exit_rate)
    p = np.arange(sites)
    catalan = gammaln(2 * p + 1) - gammaln(p + 1) - gammaln(p + 2)
    bulk = np.concatenate([[0.0], np.cumsum(np.exp(catalan + logs[sites - 1 - p] - logs[sites]))])
    profile = np.empty(sites)
    for place in range(1, sites + 1):
        rest = sites - place
        edge = inverse
        if rest:
            powers = np.arange(2, rest + 2) * inverse
            edge = float(logsumexp(_log_ballot(rest) + powers))
        profile[place - 1] = bulk[rest] + np.exp(edge + logs[place - 1] - logs[sites])
    return profile


def unit_rate_profile(sites: int) -> npt.NDArray[np.float64]:
    """Occupations at ``entry = exit_rate = 1``, float64 (N,), in closed form.

    ``<n_i> = 1/2 + (N-2i+1)/4 (2i)!/(i!)^2 (N!)^2/(2N+1)! (2N-2i+2)!/((N-i+1)!)^2``. Raises
    ModelError. Derrida et al. (1993).
    """
    sites = checked_count("sites", sites, 1, MAX_SITES)
    i = np.arange(1, sites + 1)
    rest = sites - i + 1
    logs = gammaln(2 * i + 1) - 2 * gammaln(i + 1) + 2 * gammaln(sites + 1)
    logs = logs - gammaln(2 * sites + 2) + gammaln(2 * rest + 1) - 2 * gammaln(rest + 1)
    return np.asarray(0.5 + (sites - 2 * i + 1) / 4 * np.exp(logs))
