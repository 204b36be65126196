"""Full and restarted GMRES with a right preconditioner and a residual that is recomputed.

Y. Saad, M. H. Schultz, SIAM J. Sci. Stat. Comput. 7, 856 (1986). The basis may be kept in single
precision; each restart computes the residual in double precision, so that the answer does not
suffer.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from lbwork.iterative.products import combine, project

ROUGH = 1e-3
"""Share of the first residual at which the size of the answer is known well enough."""

__all__ = ["LinearMap", "LinearSolution", "gmres"]

LinearMap = Callable[[np.ndarray], np.ndarray]


@dataclass(frozen=True, eq=False)
class LinearSolution:
    """``solution`` of ``A x = b``; ``residual``: ``||b - A x||`` recomputed; ``applies``: number of
    preconditioned applications."""

    solution: np.ndarray
    residual: float
    applies: int
    converged: bool


def _orthogonalised(basis: np.ndarray, vector: np.ndarray) -> tuple[np.ndarray, float]:
    """Coefficients along the rows of the basis and the length of what is left in ``vector``."""
    before = float(np.linalg.norm(vector))
    coefficients = project(basis, vector)
    combine(coefficients, basis, vector, -1)
    after = float(np.linalg.norm(vector))
    # Twice is enough (W. Kahan, in B. Parlett, The Symmetric Eigenvalue Problem (1980); from
    # memory); once is, when little was cancelled.
    if after < 0.5 * before:
        more = project(basis, vector)
        combine(more, basis, vector, -1)
        coefficients = coefficients + more
        after = float(np.linalg.norm(vector))
    return coefficients, after


def _cycle(
    operator: LinearMap,
    preconditioner: LinearMap,
    residual: np.ndarray,
    target: float,
    basis: np.ndarray,
    progress: Callable[[float], None] | None,
    measure: Callable[[np.ndarray], float] | None,
) -> tuple[np.ndarray, list[float]]:
    """One Krylov cycle; returns the correction in the precision of the basis.

    ``measure(correction)``: the target for the residual, asked for once when a rough correction is
    known.
    """
    beta = float(np.linalg.norm(residual))
    basis[0] = residual / beta
    steps = basis.shape[0] - 1
    small = np.zeros((steps + 1, steps), dtype=basis.dtype if basis.dtype.kind == "c" else float)
    estimates: list[float] = []
    coefficients: np.ndarray = np.zeros(0)
    for step in range(steps):
        image = operator(preconditioner(basis[step]))
        column, length = _orthogonalised(basis[: step + 1], image)
        small[: step + 1, step], small[step + 1, step] = column, length
        right = np.zeros(step + 2)
        right[0] = beta
        upper = small[: step + 2, : step + 1]
        coefficients = np.linalg.lstsq(upper, right, rcond=None)[0]
        estimates.append(float(np.linalg.norm(upper @ coefficients - right)))
        if progress is not None:
            progress(estimates[-1])
        if measure is not None and estimates[-1] <= ROUGH * beta:
            target = max(target, 0.9 * measure(preconditioner(_combined(coefficients, basis))))
            measure = None
        if estimates[-1] <= target or length <= 1e-14 * beta:
            break
        basis[step + 1] = image / length
    return preconditioner(_combined(coefficients, basis)), estimates


def _combined(coefficients: np.ndarray, basis: np.ndarray) -> np.ndarray:
    total = np.zeros(basis.shape[1], dtype=basis.dtype)
    combine(coefficients, basis[: coefficients.size], total, 1)
    return total


def gmres(
    operator: LinearMap,
    preconditioner: LinearMap,
    right_side: np.ndarray,
    *,
    target: float,
    restart: int,
    limit: int,
    precision: type | None = None,
    start: np.ndarray | None = None,
    progress: Callable[[float], None] | None = None,
) -> LinearSolution:
    """Solve ``A x = b`` to ``||b - A x|| <= target``, starting from x = 0.

    With ``start`` the target is ``target * ||start + x||`` instead, for the null vector
    ``start + x`` of A when ``b = -A start``.
    ``restart``: vectors per cycle; ``limit``: applications in all; ``precision``: type of basis and
    preconditioner (that of ``b`` by default). ``operator`` must accept both types.
    """
    kind = right_side.dtype if precision is None else np.dtype(precision)
    narrow = kind != right_side.dtype
    solution = np.zeros_like(right_side)
    residual = right_side.copy()
    size = float(np.linalg.norm(residual))
    applies = 0
    basis = np.empty((0, right_side.size), dtype=kind)
    absolute = 0.0 if start is not None else target
    while size > absolute and applies < limit:
        steps = min(restart, limit - applies)
        if basis.shape[0] != steps + 1:
            basis = np.empty((steps + 1, right_side.size), dtype=kind)
        # A narrow cycle cannot gain more digits than it carries.
        reached = solution if start is None else start + solution
        absolute = target if start is None else target * float(np.linalg.norm(reached))
        goal = max(absolute, 2e-6 * size) if narrow else absolute

        def measure(correction: np.ndarray, reached: np.ndarray = reached) -> float:
            return target * float(np.linalg.norm(reached + correction))

        # The recomputed residual is a little above the recursive one.
        correction, estimates = _cycle(
            operator,
            preconditioner,
            residual.astype(kind, copy=False),
            0.9 * goal,
            basis,
            progress,
            None if start is None else measure,
        )
        solution += correction
        residual = right_side - operator(solution)
        before, size = size, float(np.linalg.norm(residual))
        applies += len(estimates)
        if start is not None:
            absolute = target * float(np.linalg.norm(start + solution))
        if size > 0.5 * before and len(estimates) < restart:
            break
    return LinearSolution(solution, size, applies, size <= absolute)
