"""Eigenvalues nearest to a point, by a preconditioned Davidson method with harmonic extraction.

The search space is widened by the preconditioned residual of the wanted Ritz pair and restarted
with the harmonic vectors nearest to the target (E. R. Davidson, J. Comput. Phys. 17, 87 (1975);
R. B. Morgan, Linear Algebra Appl. 154-156, 289 (1991); thick restart: A. Stathopoulos, Y. Saad,
K. Wu, SIAM J. Sci. Comput. 19, 227 (1998); from memory).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import scipy.linalg

from lbwork import defaults
from lbwork.iterative.probe import smooth_start
from lbwork.iterative.products import combine, project
from lbwork.iterative.solver import SectorSolver

__all__ = ["NearestLevels", "nearest_levels"]

ROUNDING = 1e-6
"""Residual over the longest image below which its estimate from squares says nothing."""

LOOSE = 0.03
"""Relative residual at which a level is known well enough to order it after the wanted one."""


@dataclass(frozen=True, eq=False)
class NearestLevels:
    """``levels`` (k,) nearest to the target first; ``vectors`` (k, n) of unit length;
    ``residuals`` (k,): ``||L v - lambda v||``; ``applies``: preconditioned applications."""

    levels: np.ndarray
    vectors: np.ndarray
    residuals: np.ndarray
    applies: int


@dataclass(frozen=True, eq=False)
class _Pair:
    """Rayleigh quotient and coefficients of a Ritz vector; ``estimate``: of its residual from the
    small matrices, exact down to rounding of squares."""

    level: complex
    column: np.ndarray
    estimate: float


class _Search:
    """An orthonormal basis of the search space with its images."""

    def __init__(self, solver: SectorSolver, excluded: np.ndarray, capacity: int) -> None:
        size, kind = solver.space.size, solver.space.dtype
        self.solver = solver
        self.excluded = excluded
        self.basis: np.ndarray = np.empty((capacity, size), dtype=kind)
        self.images: np.ndarray = np.empty((capacity, size), dtype=kind)
        self.square: np.ndarray = np.zeros((capacity, capacity), dtype=kind)
        self.mixed: np.ndarray = np.zeros((capacity, capacity), dtype=kind)
        self.count = 0

    def _reduced(self, vector: np.ndarray, rows: np.ndarray) -> None:
        if rows.shape[0]:
            combine(project(rows, vector), rows, vector, -1)

    def widen(self, vector: np.ndarray) -> bool:
        """Add a direction; False when it lies in the space already."""
        direction = np.array(vector, dtype=self.basis.dtype)
        length = float(np.linalg.norm(direction))
        for _ in range(3):
            before = length
            self._reduced(direction, self.excluded)
            self._reduced(direction, self.basis[: self.count])
            length = float(np.linalg.norm(direction))
            if length > 0.5 * before:
                break
        if not length > 1e-14:
            return False
        direction /= length
        image = self.solver.apply(direction)
        self._reduced(image, self.excluded)
        place, after = self.count, self.count + 1
        self.basis[place], self.images[place] = direction, image
        self.square[:after, place] = project(self.images[:after], image)
        self.square[place, :after] = self.square[:after, place].conj()
        self.mixed[:after, place] = project(self.basis[:after], image)
        self.mixed[place, :place] = project(self.images[:place], direction).conj()
        self.count = after
        return True

    def combined(self, coefficients: np.ndarray, rows: np.ndarray) -> np.ndarray:
        """``coefficients @ rows`` over the space, complex coefficients of real rows included."""
        rows = rows[: self.count]
        if np.iscomplexobj(coefficients) and not np.iscomplexobj(rows):
            return np.asarray(coefficients.real @ rows + 1j * (coefficients.imag @ rows))
        return np.asarray(coefficients @ rows)

    def turn(self, frame: np.ndarray) -> None:
        """Replace the space by the span of orthonormal combinations, frame (count, fewer)."""
        fewer = frame.shape[1]
        for rows in (self.basis, self.images):
            rows[:fewer] = frame.T @ rows[: self.count]
        for table in (self.square, self.mixed):
            inner = frame.conj().T @ table[: self.count, : self.count] @ frame
            table[:fewer, :fewer] = inner
        self.count = fewer


def _small_problem(search: _Search, target: complex) -> tuple[np.ndarray, np.ndarray]:
    """Harmonic values and coefficient columns of unit length, nearest to the target first."""
    square = search.square[: search.count, : search.count]
    mixed = search.mixed[: search.count, : search.count]
    identity = np.eye(search.count)
    # (L - t)V = W - tV with orthonormal V.
    shifted = square - target * mixed.conj().T - np.conj(target) * mixed
    shifted = shifted + abs(target) ** 2 * identity
    crossed = mixed.conj().T - np.conj(target) * identity
    if not np.iscomplexobj(square) and target == 0:
        shifted, crossed = shifted.real, crossed.real
    values, columns = scipy.linalg.eig(shifted, crossed)
    finite = np.isfinite(values)
    values, columns = values[finite], columns[:, finite]
    order = np.argsort(np.abs(values))
    columns = columns[:, order] / np.linalg.norm(columns[:, order], axis=0)
    return values[order] + target, columns


def _restart_frame(values: np.ndarray, columns: np.ndarray, real: bool, keep: int) -> np.ndarray:
    """Orthonormal frame of the first ``keep`` harmonic vectors, conjugate pairs kept together."""
    chosen: list[np.ndarray] = []
    for index in range(values.size):
        if len(chosen) >= keep:
            break
        column = columns[:, index]
        if not real:
            chosen.append(column)
            continue
        chosen.append(column.real)
        if abs(values[index].imag) > 1e-10 * abs(values[index]):
            chosen.append(column.imag)
    frame, strengths, _ = np.linalg.svd(np.array(chosen).T, full_matrices=False)
    return frame[:, strengths > 1e-8 * strengths[0]]


def nearest_levels(
    solver: SectorSolver,
    *,
    seed: int,
    tolerance: float,
    excluded: np.ndarray | None = None,
    first: np.ndarray | None = None,
    target: complex = 0.0,
    wanted: int = 1,
    ordered: int = 2,
    limit: int = 400,
    capacity: int = defaults.DAVIDSON_CAPACITY,
    keep: int = defaults.DAVIDSON_KEPT,
    starts: int = defaults.DAVIDSON_STARTS,
    tell: Callable[[str], None] = lambda text: None,
) -> NearestLevels:
    """The ``wanted`` levels nearest to ``target`` to ``||L v - lambda v|| <= tolerance``.

    ``excluded`` (m, n): orthonormal rows whose orthogonal complement L maps into itself (left zero
    modes); levels inside it are sought. ``first``: a vector to begin with. ``ordered``: further
    levels that are followed until their order is certain. A real conjugate pair counts as one
    level. Seeds give independent starts. Residuals above the tolerance tell that ``limit``
    applications did not suffice.
    """
    size, kind = solver.space.size, np.dtype(solver.space.dtype)
    rows = np.zeros((0, size), dtype=kind) if excluded is None else excluded
    capacity, keep = min(capacity, size - rows.shape[0]), min(keep, size - rows.shape[0])
    before = solver.applies
    search = _Search(solver, rows, capacity + 2)
    real = kind.kind == "f"

    def smoothed(vector: np.ndarray) -> np.ndarray:
        return solver.precondition(vector.astype(solver.precision)).astype(kind)

    if first is not None:
        search.widen(first)
    for number in range(min(starts, capacity - 1)):
        start = np.asarray(smooth_start(solver, 1000 * seed + number), dtype=kind)
        search.widen(smoothed(start))
    while True:
        values, columns = _small_problem(search, target)
        pairs = _ritz_pairs(search, values, columns, wanted + ordered, real)
        # The estimate is a difference of squares as large as those of the longest image.
        diagonal = np.diagonal(search.square).real[: search.count]
        rounding = ROUNDING * float(np.sqrt(diagonal.max()))
        open_pair = None
        for rank, pair in enumerate(pairs):
            exact = rank < wanted
            bound = tolerance if exact else max(tolerance, LOOSE * abs(pair.level - target))
            if pair.estimate > max(bound, rounding) or (
                exact and _residual(search, pair)[1] > bound
            ):
                open_pair = pair
                break
        applies = solver.applies - before
        complete = search.count >= size - rows.shape[0]
        if open_pair is None or applies >= limit or complete:
            found = [_residual(search, pair) for pair in pairs]
            return NearestLevels(
                levels=np.array([pair.level for pair in pairs]),
                vectors=np.array([search.combined(pair.column, search.basis) for pair in pairs]),
                residuals=np.array([length for _, length in found]),
                applies=applies,
            )
        tell(f"{applies} applications, level {pairs[0].level:.8g}")
        residual = _residual(search, open_pair)[0]
        if search.count >= capacity:
            search.turn(_restart_frame(values, columns, real, keep))
        widened = False
        for part in (residual.real, residual.imag) if real else (residual,):
            if np.any(part):
                widened |= search.widen(smoothed(np.ascontiguousarray(part)))
        if not widened:
            noise = np.asarray(smooth_start(solver, 1000 * seed + applies + 500), dtype=kind)
            search.widen(smoothed(noise))


def _ritz_pairs(
    search: _Search, values: np.ndarray, columns: np.ndarray, count: int, real: bool
) -> list[_Pair]:
    """The first distinct Ritz pairs, one of each conjugate pair of a real sector."""
    square = search.square[: search.count, : search.count]
    mixed = search.mixed[: search.count, : search.count]
    pairs: list[_Pair] = []
    for index in range(values.size):
        if len(pairs) == count:
            break
        value, column = values[index], columns[:, index]
        single = abs(value.imag) <= 1e-10 * abs(value)
        if real and not single and value.imag < 0:
            continue
        if real and single:
            column = column.real / np.linalg.norm(column.real)
        level = complex(column.conj() @ (mixed @ column))
        spread = float((column.conj() @ (square @ column)).real) - abs(level) ** 2
        pairs.append(_Pair(level, column, float(np.sqrt(max(spread, 0.0)))))
    return pairs


def _residual(search: _Search, pair: _Pair) -> tuple[np.ndarray, float]:
    """``L v - lambda v`` of a Ritz pair and its length."""
    vector = search.combined(pair.column, search.basis)
    residual = search.combined(pair.column, search.images)
    residual = residual - (pair.level if np.iscomplexobj(residual) else pair.level.real) * vector
    return residual, float(np.linalg.norm(residual))
