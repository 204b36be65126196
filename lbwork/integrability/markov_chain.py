"""A translation-invariant Markov process on a chain: states, stationary distribution, gap."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.linalg
import scipy.sparse as sparse
from scipy.sparse.csgraph import connected_components

from lbwork import defaults
from lbwork.errors import CapacityError, NotCertifiedError, UsageError

__all__ = ["MarkovSolution", "configurations", "markov_matrix", "solve_markov"]


@dataclass(frozen=True, eq=False)
class MarkovSolution:
    """A process on a finite chain.

    ``particles``: their number if it was fixed. ``states``: int64 (S,), base-d numbers, site 1 most
    significant. ``stationary_states``: sets of states that cannot be left. ``probabilities``:
    float64 (S,), the stationary distribution, None if there are several. ``profile``: float64
    (sites,), mean occupation by the first on-site state (particle, spin up). ``current``: float64
    (bonds,), particles to the right per time, from exchanges; half the current of sigma^z. ``gap``:
    smallest ``-Re`` of the levels that are not zero, ``level`` that level; None when every state
    is stationary or it was not asked for. ``residual``: ``||M p||_1 / ||M||_1`` or that of the
    level, the larger one.
    """

    sites: int
    boundary: str
    particles: int | None
    states: np.ndarray
    stationary_states: int
    probabilities: np.ndarray | None
    profile: np.ndarray | None
    current: np.ndarray | None
    gap: float | None
    level: complex | None
    residual: float

    def to_dict(self) -> dict[str, Any]:
        """A JSON document without the distribution."""
        return {
            "sites": self.sites,
            "boundary": self.boundary,
            "particles": self.particles,
            "states": int(self.states.size),
            "stationary_states": self.stationary_states,
            "profile": None if self.profile is None else self.profile.tolist(),
            "current": None if self.current is None else self.current.tolist(),
            "gap": self.gap,
            "level": None if self.level is None else [self.level.real, self.level.imag],
            "residual": self.residual,
        }

    def __str__(self) -> str:
        parts = [f"{self.states.size} states on {self.sites} sites ({self.boundary})"]
        if self.particles is not None:
            parts.append(f"{self.particles} particles")
        parts.append(f"{self.stationary_states} stationary")
        if self.current is not None:
            parts.append(f"mean current {float(self.current.mean()):.6g}")
        if self.gap is not None:
            parts.append(f"gap {self.gap:.6g}")
        return ", ".join([*parts, f"residual {self.residual:.1e}"])


def configurations(sites: int, dimension: int, particles: int | None) -> np.ndarray:
    """All states, or those with this many sites in the first state (two states only)."""
    if particles is None:
        return np.arange(dimension**sites, dtype=np.int64)
    every = np.arange(2**sites, dtype=np.int64)
    empty = np.bitwise_count(every)
    return every[empty == sites - particles]


def markov_matrix(
    terms: list[tuple[tuple[int, ...], np.ndarray]], states: np.ndarray, sites: int, dimension: int
) -> sparse.csr_matrix:
    """``M`` of ``dp/dt = M p`` on the given sorted states: csr (S, S)."""
    rows, columns, values = [], [], []
    index = np.arange(states.size)
    for places, matrix in terms:
        units = [dimension ** (sites - 1 - place) for place in places]
        local = np.zeros(states.size, dtype=np.int64)
        for unit in units:
            local = local * dimension + (states // unit) % dimension
        for after, before in zip(*np.nonzero(matrix), strict=True):
            chosen = index[local == before]
            if chosen.size == 0:
                continue
            shift, old, new = 0, int(before), int(after)
            for unit in reversed(units):
                old, first = divmod(old, dimension)
                new, second = divmod(new, dimension)
                shift += (second - first) * unit
            target = np.searchsorted(states, states[chosen] + shift)
            rows.append(target)
            columns.append(chosen)
            values.append(np.full(chosen.size, matrix[after, before]))
    shape = (states.size, states.size)
    if not rows:
        return sparse.csr_matrix(shape)
    found = (np.concatenate(rows), np.concatenate(columns))
    return sparse.coo_matrix((np.concatenate(values), found), shape=shape).tocsr()


def _closed_sets(matrix: sparse.csr_matrix) -> list[np.ndarray]:
    """Strongly connected sets of states without a way out."""
    graph = matrix.T.tocoo()
    graph = sparse.coo_matrix((graph.data != 0, (graph.row, graph.col)), shape=matrix.shape).tocsr()
    graph.eliminate_zeros()
    count, labels = connected_components(graph, connection="strong")
    steps = graph.tocoo()
    leaving = labels[steps.row] != labels[steps.col]
    open_sets = np.unique(labels[steps.row[leaving]])
    closed = np.setdiff1d(np.arange(count), open_sets)
    if closed.size > defaults.SUBCHAIN_LISTED:
        return [np.zeros(0, dtype=np.int64)] * int(closed.size)
    return [np.flatnonzero(labels == label) for label in closed]


def _levels(matrix: sparse.csr_matrix, count: int) -> tuple[np.ndarray, np.ndarray]:
    size = matrix.shape[0]
    if size <= defaults.SUBCHAIN_DENSE:
        values, vectors = scipy.linalg.eig(matrix.toarray())
    else:
        start = np.random.default_rng(3).random(size)
        basis = min(size - 1, max(32, 4 * count))
        values, vectors = sparse.linalg.eigs(
            matrix, count, which="LR", v0=start, ncv=basis, maxiter=20_000, tol=1e-11
        )
    order = np.argsort(-values.real, kind="stable")
    return values[order], vectors[:, order]


def _stationary(matrix: sparse.csr_matrix) -> np.ndarray:
    """The distribution of an irreducible matrix (S, S)."""
    size = matrix.shape[0]
    if size == 1:
        return np.ones(1)
    if size <= defaults.SUBCHAIN_DENSE:
        system = matrix.toarray()
        system[-1] = 1
        right = np.zeros(size)
        right[-1] = 1
        return np.asarray(np.linalg.solve(system, right))
    start = np.full(size, 1 / size)
    if np.abs(matrix @ start).sum() < 1e-14 * abs(matrix).sum():
        return start
    # Fixed point of p -> -A^-1 B p with M = A + B and A the lower triangle: one sweep follows many
    # moves, since most of a driven process's moves change the number of the state one way.
    upper = sparse.triu(matrix, 1, format="csr")
    lower = sparse.linalg.splu(
        sparse.tril(matrix, format="csc"), permc_spec="NATURAL", diag_pivot_thresh=0.0
    )
    sweep = sparse.linalg.LinearOperator(
        (size, size), matvec=lambda vector: -lower.solve(upper @ vector), dtype=float
    )
    _, vectors = sparse.linalg.eigs(sweep, 1, which="LR", v0=start, ncv=16, maxiter=2_000)
    vector = vectors[:, 0].real
    return np.asarray(vector / vector.sum())


def solve_markov(
    terms: list[tuple[tuple[int, ...], np.ndarray]],
    sites: int,
    boundary: str,
    dimension: int,
    particles: int | None,
    slowest: bool = True,
) -> MarkovSolution:
    """Stationary distribution, profile, current and gap; see :class:`MarkovSolution`.

    The gap takes most of the time; without ``slowest`` it is left out.
    ``terms``: 0-based places and Markov matrices, columns before, rows after. UsageError for a bad
    number of particles; CapacityError above ``SUBCHAIN_STATES`` states; NotCertifiedError when a
    residual is too large.
    """
    if particles is not None and (dimension != 2 or not 0 <= particles <= sites):
        raise UsageError(
            f"particles = {particles} do not fit on {sites} sites of {dimension} states; give 0.."
            f"{sites} for two states per site, or None"
        )
    if float(dimension) ** sites > defaults.SUBCHAIN_STATES:
        raise CapacityError(
            f"{sites} sites have {float(dimension) ** sites:.2g} states, at most "
            f"{defaults.SUBCHAIN_STATES:.2g} are treated; use fewer sites"
        )
    states = configurations(sites, dimension, particles)
    matrix = markov_matrix(terms, states, sites, dimension)
    scale = float(abs(matrix).sum(axis=0).max()) if matrix.nnz else 0.0
    closed = _closed_sets(matrix)
    residual = 0.0
    probabilities = None
    if len(closed) == 1:
        inside = closed[0]
        probabilities = np.zeros(states.size)
        probabilities[inside] = _stationary(matrix[inside][:, inside].tocsr())
        if scale:
            residual = float(np.abs(matrix @ probabilities).sum()) / scale
    gap, level, error = _gap(matrix, len(closed), scale) if slowest else (None, None, 0.0)
    residual = max(residual, error)
    profile, current = _observed(terms, states, sites, dimension, probabilities)
    solution = MarkovSolution(
        sites,
        boundary,
        particles,
        states,
        len(closed),
        probabilities,
        profile,
        current,
        gap,
        level,
        residual,
    )
    lowest = 0.0 if probabilities is None else float(probabilities.min())
    if residual > defaults.SUBCHAIN_RESIDUAL or lowest < -defaults.SUBCHAIN_RESIDUAL:
        raise NotCertifiedError(
            f"the process on {sites} sites has residual {residual:.1e} and smallest probability "
            f"{lowest:.1e}; use fewer sites",
            solution,
        )
    return solution


def _gap(
    matrix: sparse.csr_matrix, zeros: int, scale: float
) -> tuple[float | None, complex | None, float]:
    """The slowest level that is not a zero mode, and its residual."""
    size = matrix.shape[0]
    if zeros >= size or scale == 0:
        return None, None, 0.0
    if size > defaults.SUBCHAIN_DENSE and zeros > defaults.SUBCHAIN_LISTED:
        return None, None, 0.0
    values, vectors = _levels(matrix, min(zeros + 3, size - 2))
    by_size = np.argsort(np.abs(values), kind="stable")[zeros:]
    best = int(by_size[np.argmax(values[by_size].real)])
    vector = vectors[:, best] / np.linalg.norm(vectors[:, best])
    error = float(np.linalg.norm(matrix @ vector - values[best] * vector)) / scale
    level = complex(values[best].real, abs(values[best].imag))
    return -level.real, level, error


def _observed(
    terms: list[tuple[tuple[int, ...], np.ndarray]],
    states: np.ndarray,
    sites: int,
    dimension: int,
    probabilities: np.ndarray | None,
) -> tuple[np.ndarray | None, np.ndarray | None]:
    """Occupation of the first on-site state and its current over the bonds by exchanges."""
    if probabilities is None:
        return None, None
    units = dimension ** np.arange(sites - 1, -1, -1, dtype=np.int64)
    profile = np.array([probabilities[(states // unit) % dimension == 0].sum() for unit in units])
    flows = []
    for places, matrix in terms:
        if len(places) != 2:
            continue
        local = (states // units[places[0]]) % dimension * dimension
        local = local + (states // units[places[1]]) % dimension
        share = np.bincount(local, weights=probabilities, minlength=dimension**2)
        total = 0.0
        for other in range(1, dimension):
            # State 0 is the particle: (0, other) -> (other, 0) moves it to the right.
            total += matrix[other * dimension, other] * share[other]
            total -= matrix[other, other * dimension] * share[other * dimension]
        flows.append(total)
    return profile, np.array(flows)
