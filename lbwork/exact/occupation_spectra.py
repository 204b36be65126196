"""Stationary state, gap and current statistics of classical processes by sparse methods."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import scipy.linalg
import scipy.sparse as sparse
import scipy.sparse.linalg
from scipy.sparse.csgraph import connected_components

from lbwork import defaults
from lbwork.errors import ModelError, NotCertifiedError
from lbwork.exact.occupation import (
    OccupationProcess,
    configurations,
    markov_generator,
    occupations,
)

__all__ = ["ProcessGap", "ProcessState", "growth_rate", "process_gap", "stationary_process"]

SEEDS = (1, 2)
LEVELS = 6


@dataclass(frozen=True, eq=False)
class ProcessState:
    """Stationary distribution of a classical process.

    configurations (n,) int64 and probabilities (n,); profile (L,): occupations; currents: bond to
    particle current to the right, for every bond that a move crosses. residual: ``||W P||_1`` over
    the largest rate at which a configuration is left.
    """

    configurations: npt.NDArray[np.int64]
    probabilities: npt.NDArray[np.float64]
    profile: npt.NDArray[np.float64]
    currents: dict[int, float]
    residual: float


@dataclass(frozen=True)
class ProcessGap:
    """Slowest decaying level. residual: ``||W v - E v||`` over the norm of W for a unit vector.

    zero_modes: stationary states (closed sets of configurations).
    """

    gap: float
    eigenvalue: complex
    zero_modes: int
    residual: float


def _closed_sets(matrix: sparse.csr_matrix) -> int:
    """Sets of configurations that lead to each other and cannot be left: one zero mode each."""
    # Entry (row, column) is a step from the column to the row.
    graph = matrix.T.tocsr()
    count, label = connected_components(graph, connection="strong")
    steps = graph.tocoo()
    leaving = label[steps.row] != label[steps.col]
    return int(count - np.unique(label[steps.row[leaving & (steps.data != 0)]]).size)


def _norm(matrix: sparse.csr_matrix) -> float:
    return float(scipy.sparse.linalg.norm(matrix, np.inf))


def _largest(
    matrix: sparse.csr_matrix, levels: int, seed: int
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Levels with the largest real parts, unit vectors and residuals, by descending real part."""
    size = matrix.shape[0]
    if size <= max(defaults.FILTER_SMALLEST_DIMENSION, 2 * LEVELS + 2):
        values, vectors = scipy.linalg.eig(matrix.toarray())
        chosen = np.argsort(-values.real, kind="stable")[:levels]
    else:
        start = np.random.default_rng(seed).random(size)
        found = scipy.sparse.linalg.eigs(
            matrix,
            levels,
            which="LR",
            v0=start,
            ncv=min(size - 1, max(24, 4 * levels)),
            maxiter=20_000,
        )
        values, vectors = found
        chosen = np.argsort(-values.real, kind="stable")
    values, vectors = values[chosen], vectors[:, chosen]
    vectors = vectors / np.linalg.norm(vectors, axis=0)
    residuals = np.linalg.norm(matrix @ vectors - vectors * values, axis=0)
    return values, vectors, residuals / max(_norm(matrix), np.finfo(float).tiny)


def _stationary_vector(matrix: sparse.csr_matrix) -> np.ndarray:
    """Fixed point of ``v -> -A^-1 B v``, W = A + B with A the lower triangle of W.

    Nearly all moves of a driven process go up or down in the number of the configuration, so that
    one solve with A follows many moves: some ten times fewer steps than with W itself.
    """
    size = matrix.shape[0]
    absorbing = np.flatnonzero(matrix.diagonal() == 0)
    if absorbing.size:
        return np.asarray(np.arange(size) == absorbing[0], dtype=float)
    if size <= defaults.FILTER_SMALLEST_DIMENSION:
        vector = scipy.linalg.svd(matrix.toarray())[2][-1]
        return np.asarray(vector / vector.sum())
    upper = sparse.csr_matrix(sparse.triu(matrix, 1))
    options = {"SymmetricMode": True}
    lower = scipy.sparse.linalg.splu(
        sparse.csc_matrix(sparse.tril(matrix)),
        permc_spec="NATURAL",
        diag_pivot_thresh=0.0,
        options=options,
    )
    operator = scipy.sparse.linalg.LinearOperator(
        (size, size), lambda vector: -lower.solve(upper @ vector), dtype=float
    )
    vectors = scipy.sparse.linalg.eigs(operator, 1, which="LR", v0=np.ones(size), ncv=12)[1]
    vector = vectors[:, 0].real
    return np.asarray(vector / vector.sum())


def stationary_process(process: OccupationProcess, particles: int | None = None) -> ProcessState:
    """The stationary distribution, with profile and currents; up to 20 sites.

    Needs a process with one stationary state: for one that conserves particles give their number.
    Raises ModelError when there are several, CapacityError, NotCertifiedError when the residual is
    above 1e-9 or a probability is negative.
    """
    matrix = markov_generator(process, particles)
    closed = _closed_sets(matrix)
    if closed != 1:
        raise ModelError(
            f"the process has {closed} stationary states; give the number of particles, or rates "
            "that connect all configurations"
        )
    states = configurations(process, particles)
    vector = _stationary_vector(matrix)
    residual = float(np.abs(matrix @ vector).sum() / max(_norm(matrix), np.finfo(float).tiny))
    if residual > defaults.STEADY_RESIDUAL_TOLERANCE or vector.min() < -defaults.STEADY_NEGATIVITY:
        raise NotCertifiedError(
            f"stationary state of {states.size} configurations: residual {residual:.1e}, smallest "
            f"probability {vector.min():.1e}; use a shorter chain",
            vector,
        )
    currents: dict[int, float] = {}
    for move in process.moves:
        if move.bond is not None:
            fits = np.ones(states.size, dtype=bool)
            for site, digit in zip(move.sites, move.before, strict=True):
                fits &= ((states >> (process.sites - 1 - site)) & 1) == digit
            share = move.rate * move.transfer * float(vector[fits].sum())
            currents[move.bond] = currents.get(move.bond, 0.0) + share
    profile = vector @ occupations(states, process.sites)
    return ProcessState(states, vector, np.asarray(profile), currents, residual)


def process_gap(process: OccupationProcess, particles: int | None = None) -> ProcessGap:
    """Smallest ``-Re E`` over the levels of W that are not stationary states.

    Up to 1500 configurations from the dense matrix; beyond, the slowest levels are sought twice
    from different starts, and must agree. Raises ModelError when all or too many levels are zero
    modes, CapacityError, NotCertifiedError.
    """
    matrix = markov_generator(process, particles)
    closed = _closed_sets(matrix)
    size = matrix.shape[0]
    if closed == size or (closed > LEVELS and size > defaults.GAP_DENSE_DIMENSION):
        raise ModelError(
            f"{closed} of {size} levels are stationary; give the number of particles, or rates "
            "that connect the configurations"
        )
    if size <= defaults.GAP_DENSE_DIMENSION:
        values, vectors = scipy.linalg.eig(matrix.toarray())
        order = np.argsort(np.abs(values), kind="stable")[closed:]
        best = order[np.argmax(values[order].real)]
        miss = matrix @ vectors[:, best] - values[best] * vectors[:, best]
        return _gap(complex(values[best]), closed, float(np.linalg.norm(miss)) / _norm(matrix))
    found = []
    for seed in SEEDS:
        values, _, residuals = _largest(matrix, min(LEVELS + closed, size - 2), seed)
        order = np.argsort(np.abs(values), kind="stable")[closed:]
        best = order[np.argmax(values[order].real)]
        found.append((complex(values[best]), float(residuals[best])))
    (first, error), (second, other) = found
    spread = abs(first.real - second.real)
    if max(
        error, other
    ) > defaults.GAP_RESIDUAL_TOLERANCE or spread > defaults.GAP_AGREEMENT_TOLERANCE * abs(
        first.real
    ):
        raise NotCertifiedError(
            f"gap of {size} configurations: two starts give {-first.real:.9g} and "
            f"{-second.real:.9g} with residuals {error:.1e} and {other:.1e}; use a shorter chain",
            first,
        )
    return _gap(first, closed, max(error, other))


def _gap(value: complex, closed: int, residual: float) -> ProcessGap:
    # The pair E, E* is one mode; the gap is given with Im E >= 0.
    return ProcessGap(-value.real, complex(value.real, abs(value.imag)), closed, residual)


def growth_rate(
    process: OccupationProcess, field: float, bond: int = 0, particles: int | None = None
) -> float:
    """Scaled cumulant generating function ``lim log <exp(field Q)> / t`` of the current on a bond.

    Q counts particles that cross ``bond`` to the right (0 the left reservoir, L the right one, or
    the closing bond of a ring). The largest eigenvalue of the tilted matrix; that it is the largest
    one is certified by its eigenvector of one sign (Perron and Frobenius). Raises ModelError,
    CapacityError, NotCertifiedError.
    """
    matrix = markov_generator(process, particles, field=field, bond=bond)
    if connected_components(matrix, connection="strong")[0] != 1:
        raise ModelError(
            "the configurations do not all lead to each other; give the number of particles, or "
            "rates that connect them"
        )
    values, vectors, residuals = _largest(matrix, 1, SEEDS[0])
    # A complex eigenvector has a free phase; that of a simple real level is real up to it.
    vector = vectors[:, 0]
    vector = (vector / vector[np.argmax(np.abs(vector))]).real
    if residuals[0] > defaults.GAP_RESIDUAL_TOLERANCE or vector.min() < -defaults.STEADY_NEGATIVITY:
        raise NotCertifiedError(
            f"growth rate of {matrix.shape[0]} configurations at field {field:g}: residual "
            f"{residuals[0]:.1e}, smallest entry {vector.min():.1e}; use a smaller field",
            float(values[0].real),
        )
    return float(values[0].real)
