"""Evidence that the computed numbers are the eigenvalues of the block.

Two identities catch a lost or doubled level, sampled residuals catch a wrong one, and the largest
real part catches a generator that is none.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import scipy.sparse as sparse
from scipy.linalg import lapack
from scipy.sparse.csgraph import connected_components
from scipy.spatial import cKDTree

from lbwork import defaults
from lbwork.errors import NotCertifiedError
from lbwork.provenance import limited_threads
from lbwork.spectrum.parts import Parts
from lbwork.spectrum.records import SpectrumCertificate

__all__ = [
    "certify_sector",
    "failed_conditions",
    "level_residual",
    "require",
    "sample_levels",
    "unreliable_share",
]


def level_residual(
    matrix: np.ndarray, level: complex, generator: np.random.Generator
) -> tuple[float, np.ndarray]:
    """``||(A - level) v||`` for the best unit vector v that inverse iteration finds, and v.

    It bounds the smallest singular value of ``A - level`` from above. ``matrix`` (n, n) dense.
    """
    shifted = np.array(matrix, dtype=complex, order="F")
    diagonal = np.arange(shifted.shape[0])
    shifted[diagonal, diagonal] -= level
    scale = np.linalg.norm(shifted)
    if scale == 0:
        return 0.0, np.eye(1, shifted.shape[0], dtype=complex).ravel()
    factors, pivots, _ = lapack.zgetrf(shifted)
    # An exact eigenvalue leaves a zero pivot; rounding-sized ones keep the direction.
    pivot = factors[diagonal, diagonal]
    tiny = np.abs(pivot) < np.finfo(float).eps * scale * 1e-3
    factors[diagonal[tiny], diagonal[tiny]] = np.finfo(float).eps * scale * 1e-3
    vector = generator.normal(size=diagonal.size) + 1j * generator.normal(size=diagonal.size)
    for _ in range(3):
        for transposed in (2, 0):
            vector = lapack.zgetrs(factors, pivots, vector, trans=transposed)[0]
            vector /= np.linalg.norm(vector)
    return float(np.linalg.norm(shifted @ vector)), vector


def sample_levels(
    parts: Parts,
    eigenvalues: np.ndarray,
    samples: int,
    generator: np.random.Generator,
    threads: int,
) -> tuple[float, int]:
    """Largest absolute residual over randomly drawn levels, and how many were drawn.

    Levels of parts of size one are exact and are not drawn.
    """
    part_of = np.repeat(np.arange(parts.sizes.size), parts.sizes)
    candidates = np.flatnonzero(parts.sizes[part_of] > 1)
    if candidates.size == 0 or samples == 0:
        return 0.0, 0
    if parts.sizes.max() > defaults.LEVEL_SAMPLES_CHEAP_DIMENSION:
        samples = 1
    chosen = generator.choice(candidates, size=min(samples, candidates.size), replace=False)
    worst = 0.0
    with limited_threads(threads):
        for index in chosen:
            matrix = parts.dense(int(part_of[index]))
            worst = max(worst, level_residual(matrix, eigenvalues[index], generator)[0])
    return worst, int(chosen.size)


def _distinct(points: np.ndarray, tolerance: float) -> np.ndarray:
    """Number of the degenerate cluster of each point, (n,) int; clusters are joined by distance."""
    close = cKDTree(points).query_pairs(tolerance, output_type="ndarray")
    graph = sparse.coo_matrix(
        (np.ones(len(close), dtype=np.int8), (close[:, 0], close[:, 1])),
        shape=(len(points), len(points)),
    )
    return np.asarray(connected_components(graph, directed=False)[1])


def unreliable_share(eigenvalues: np.ndarray, bounds: np.ndarray, sizes: Sequence[int]) -> float:
    """Share of levels whose error bound is not small against the distance to the nearest level.

    Distances are taken inside irreducible parts, between distinct levels: those closer than
    :data:`lbwork.defaults.LEVEL_DEGENERACY_TOLERANCE` times the radius are one degenerate level.
    Parts with one distinct level are always reliable.
    """
    unreliable, start = 0, 0
    for size in sizes:
        levels, errors = eigenvalues[start : start + size], bounds[start : start + size]
        start += size
        if size == 1:
            continue
        points = np.column_stack([levels.real, levels.imag])
        radius = float(np.abs(levels).max())
        cluster = _distinct(points, defaults.LEVEL_DEGENERACY_TOLERANCE * radius)
        first = np.unique(cluster, return_index=True)[1]
        if first.size == 1:
            continue
        nearest = cKDTree(points[first]).query(points[first], k=2)[0][:, 1]
        unreliable += int(np.sum(errors > defaults.LEVEL_ERROR_SHARE * nearest[cluster]))
    return unreliable / max(eigenvalues.size, 1)


def certify_sector(
    matrix: sparse.csr_matrix,
    parts: Parts,
    levels: tuple[np.ndarray, np.ndarray, np.ndarray],
    sampled: tuple[float, int],
    norm: float,
    threads: int,
) -> SpectrumCertificate:
    """Collect the certificate of a sector.

    ``levels``: eigenvalues, error bounds and condition numbers, (n,) each; ``sampled``: result of
    :func:`sample_levels`; ``norm``: scale of the block ``matrix``, positive.
    """
    eigenvalues, bounds, conditions = levels
    frobenius = max(float(np.linalg.norm(matrix.data)), norm)
    trace = matrix.diagonal().sum()
    square = (matrix.multiply(matrix.T)).sum()
    return SpectrumCertificate(
        trace_error=float(abs(eigenvalues.sum() - trace) / (np.sqrt(eigenvalues.size) * frobenius)),
        square_error=float(abs((eigenvalues**2).sum() - square) / frobenius**2),
        residual=sampled[0] / norm,
        sampled_levels=sampled[1],
        largest_real_part=float(eigenvalues.real.max(initial=-np.inf)),
        largest_condition=float(min(conditions.max(), 1 / np.finfo(float).eps)),
        unreliable_levels=unreliable_share(
            eigenvalues, bounds, [int(size) for size in parts.sizes]
        ),
        threads=threads,
    )


def failed_conditions(
    certificate: SpectrumCertificate, eigenvalues: np.ndarray, bounds: np.ndarray, norm: float
) -> list[str]:
    """What is wrong, in words; empty when the sector is certified.

    A real part may be positive by the error bound of its own level.
    """
    failures = []
    for name, value, limit in (
        ("trace identity", certificate.trace_error, defaults.TRACE_TOLERANCE),
        ("trace-of-square identity", certificate.square_error, defaults.TRACE_TOLERANCE),
        ("residual of a sampled level", certificate.residual, defaults.LEVEL_RESIDUAL_TOLERANCE),
    ):
        if not value <= limit:
            failures.append(f"{name} off by {value:.1e}, limit {limit:.0e}")
    excess = eigenvalues.real - bounds - defaults.ZERO_MODE_TOLERANCE * norm
    if np.any(excess > 0):
        worst = eigenvalues[int(np.argmax(excess))]
        failures.append(f"eigenvalue {worst:.6g} has a positive real part")
    return failures


def require(failures: list[str], label: str, partial: object) -> None:
    """Raise NotCertifiedError with everything that failed in the sector named ``label``."""
    if failures:
        raise NotCertifiedError(f"sector '{label}': {'; '.join(failures)}", partial)
