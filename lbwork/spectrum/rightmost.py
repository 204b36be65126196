"""The slowest levels of a large sparse block, wherever they lie along the imaginary axis.

A Krylov search in ``exp(t B)`` ranks levels by ``exp(t Re lambda)``: it needs no factorisation, and
slow coherent oscillations far from zero are found like any other, which a shift near zero misses.
The exponential is a product of short Taylor polynomials; its accuracy is irrelevant, since the
levels are those of B itself on the subspace found, with residuals of B.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.linalg
import scipy.sparse as sparse
from scipy.sparse.linalg import ArpackNoConvergence, LinearOperator, eigs

from lbwork import defaults
from lbwork.errors import NotCertifiedError
from lbwork.spectrum.parts import block_norm

__all__ = ["SlowLevels", "require_decay", "rightmost_levels"]


@dataclass(frozen=True, eq=False)
class SlowLevels:
    """Levels (k,) complex128 with unit vectors (n, k) and residuals ``||B v - lambda v||`` (k,)."""

    levels: np.ndarray
    vectors: np.ndarray
    residuals: np.ndarray

    def select(self, chosen: np.ndarray) -> SlowLevels:
        """The levels at the given positions or where a mask is true."""
        return SlowLevels(self.levels[chosen], self.vectors[:, chosen], self.residuals[chosen])


def require_decay(found: SlowLevels, tolerance: float, label: str) -> None:
    """Raise NotCertifiedError when no level found decays.

    Only a decaying level proves that all slower ones were found: a closed subspace can hold
    any number of levels on the imaginary axis.
    """
    if np.all(np.abs(found.levels.real) <= tolerance):
        raise NotCertifiedError(
            f"sector '{label}': all {found.levels.size} slowest levels lie on the imaginary axis "
            "and there may be more; ask for more levels or use a factorisation"
        )


def _filter(matrix: sparse.csr_matrix, norm: float, steps: int, stretch: float) -> LinearOperator:
    """``exp(t B)`` for ``t = steps * stretch * FILTER_STEP / norm`` as a product of polynomials."""
    step = stretch * defaults.FILTER_STEP / norm

    def act(vector: np.ndarray) -> np.ndarray:
        total = vector.ravel()
        for _ in range(steps):
            term = total
            for order in range(1, defaults.FILTER_DEGREE + 1):
                term = (step / order) * (matrix @ term)
                total = total + term
        return total

    return LinearOperator(matrix.shape, matvec=act, dtype=matrix.dtype)


def rightmost_levels(
    matrix: sparse.csr_matrix, count: int, seed: int, stretch: float = 1.0
) -> SlowLevels:
    """The ``count`` levels of largest real part of a csr block, from one seeded start vector.

    ``stretch`` (close to 1) changes the time of the exponential, so that two calls do not share
    accidental coincidences of ``exp(t lambda)``. A multiple level may be found once only: combine
    starts to count it. The block must have more than
    :data:`lbwork.defaults.FILTER_SMALLEST_DIMENSION` states. Raises NotCertifiedError when the
    search does not converge.
    """
    norm = block_norm(matrix)
    start = np.random.default_rng(seed).normal(size=matrix.shape[0])
    steps = round(defaults.FILTER_TIME / defaults.FILTER_STEP)
    for attempt in range(4):
        wanted = count * (1 + attempt)
        try:
            vectors = eigs(
                _filter(matrix, norm, steps * 2**attempt, stretch),
                k=wanted,
                ncv=max(3 * wanted, 24),
                which="LM",
                v0=start.astype(matrix.dtype),
                tol=1e-12,
                maxiter=60,
            )[1]
        except ArpackNoConvergence:
            continue
        return _project(matrix, vectors)
    raise NotCertifiedError(
        f"the slowest levels of a part of size {matrix.shape[0]} did not converge: they are too "
        "close together; use fewer sites"
    )


def _project(matrix: sparse.csr_matrix, vectors: np.ndarray) -> SlowLevels:
    """Eigenpairs of B on the span of the given vectors, slowest first.

    For a real block the span is made real, so that conjugate pairs come out exactly.
    """
    if not np.iscomplexobj(matrix.data):
        vectors = np.hstack([vectors.real, vectors.imag])
    left, strengths, _ = np.linalg.svd(vectors, full_matrices=False)
    basis = left[:, strengths > 1e-8 * strengths[0]]
    levels, inner = scipy.linalg.eig(basis.conj().T @ (matrix @ basis))
    found = basis @ inner
    found /= np.linalg.norm(found, axis=0)
    residuals = np.linalg.norm(matrix @ found - found * levels, axis=0)
    order = np.lexsort((np.abs(levels.imag), -levels.real))
    return SlowLevels(levels, found, residuals).select(order)
