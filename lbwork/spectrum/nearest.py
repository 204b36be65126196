"""The gap of long chains: levels nearest to zero, matrix-free, agreed on by independent starts."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np

from lbwork import defaults
from lbwork.errors import NotCertifiedError
from lbwork.generator import Lindbladian
from lbwork.iterative import (
    ChainEquations,
    ClosedChain,
    NearestLevels,
    SectorSolver,
    SectorSpace,
    chain_equations,
    closed_chain,
    component_matrix,
    dense_matrix,
    differences,
    nearest_levels,
    part_generators,
    whole_space,
)
from lbwork.model import Model
from lbwork.provenance import limited_threads
from lbwork.spectrum.options import GapOptions, zero_tolerance
from lbwork.spectrum.records import GapResult
from lbwork.symmetry import SymmetryReport
from lbwork.symmetry.charges import label_text

__all__ = ["nearest_gap"]

Tell = Callable[[str], None]
_MOST = 8
"""Zero modes of one part above which it is left to the exhaustive method."""


@dataclass(frozen=True, eq=False)
class _PartLevels:
    """Levels of one part of a sector, zero modes taken out."""

    space: SectorSpace
    label: str
    zero_modes: int
    levels: np.ndarray
    vectors: np.ndarray
    dense: bool
    reach: float
    applies: int


def _traces(space: SectorSpace) -> np.ndarray:
    """The left zero mode that every part with populations has, as rows of unit length."""
    if not space.hermitian:
        return np.zeros((0, space.size), dtype=space.dtype)
    identity = space.identity()
    return (identity / np.linalg.norm(identity))[None, :]


def _small_part(solver: SectorSolver, label: str, zero: float) -> _PartLevels:
    matrix = dense_matrix(solver)
    levels, vectors = np.linalg.eig(matrix)
    order = np.argsort(np.abs(levels))
    levels, vectors = levels[order], vectors[:, order].T
    moving = np.abs(levels) > zero
    null = int(np.sum(~moving))
    return _PartLevels(solver.space, label, null, levels[moving], vectors[moving], True, np.inf, 0)


def _agreed(first: NearestLevels, second: NearestLevels, number: int, zero: float) -> str:
    """Empty when the first ``number`` levels of two starts agree, else what differs."""
    one, other = first.levels[:number], second.levels[:number]
    for left, right in zip(one, other, strict=True):
        allowed = defaults.GAP_AGREEMENT_TOLERANCE * abs(left) + zero
        if min(abs(left - right), abs(left - right.conjugate())) > allowed:
            return f"independent starts give {left:.10g} and {right:.10g}"
    return ""


def _iterated_part(
    solver: SectorSolver,
    label: str,
    zero: float,
    tolerance: float,
    options: GapOptions,
    tell: Tell,
) -> _PartLevels:
    excluded = _traces(solver.space)
    wanted = 1
    while True:
        runs: list[NearestLevels] = []

        def say(words: str, runs: list[NearestLevels] = runs) -> None:
            tell(f"{label}, start {len(runs) + 1}: {words}")

        for start in range(max(2, options.starts)):
            found = nearest_levels(
                solver,
                seed=options.seed + start + 1,
                tolerance=tolerance,
                excluded=excluded,
                wanted=wanted,
                ordered=defaults.GAP_ORDERED,
                limit=defaults.ITERATIVE_LIMIT,
                tell=say,
            )
            worst = float(found.residuals[:wanted].max())
            if worst > tolerance:
                raise NotCertifiedError(
                    f"the levels nearest to zero of '{label}' did not converge in "
                    f"{found.applies} applications: residual {worst:.1e}, wanted {tolerance:.1e}"
                )
            runs.append(found)
        for other in runs[1:]:
            problem = _agreed(runs[0], other, wanted, zero)
            if problem:
                raise NotCertifiedError(f"gap of '{label}': {problem}; use another seed")
        best = runs[0]
        exact = np.abs(best.levels[:wanted])
        null = int(np.sum(exact <= zero))
        # Every level that may be slower than the nearest one must be exact: it is inside the disc
        # whose radius is the first level that was only followed.
        slowest = np.min(-best.levels[:wanted].real[exact > zero], initial=np.inf)
        followed = best.levels[wanted:]
        closer = bool(followed.size) and float(np.min(-followed.real)) < 1.2 * slowest
        if null < wanted and not closer:
            break
        wanted += 1
        if wanted > _MOST:
            raise NotCertifiedError(
                f"'{label}' has {null} zero modes and many slow levels; use the exhaustive method "
                "with fewer sites"
            )
    moving = np.abs(best.levels) > zero
    reach = float(np.abs(followed).min()) if followed.size else np.inf
    return _PartLevels(
        solver.space,
        label,
        null + excluded.shape[0],
        best.levels[moving],
        best.vectors[moving],
        False,
        reach,
        sum(run.applies for run in runs),
    )


def _part_label(equations: ChainEquations, space: SectorSpace, parts: int) -> str:
    """Charges of a part in words: the difference, and strong charges where they are fixed."""
    groups = equations.groups
    weak = [index for index, flag in enumerate(groups.strong) if not flag]
    strong = [index for index, flag in enumerate(groups.strong) if flag]
    words = []
    if weak:
        chosen = tuple(space.difference[index] for index in weak)
        words.append(label_text([groups.charges[index] for index in weak], chosen))
    kets = {tuple(groups.labels[ket][strong].tolist()) for ket, _ in space.pairs}
    bras = {tuple(groups.labels[bra][strong].tolist()) for _, bra in space.pairs}
    if strong and len(kets) == len(bras) == 1:
        charges = [groups.charges[index] for index in strong]
        words.append(
            label_text(charges, kets.pop()) + " and bra: " + label_text(charges, bras.pop())
        )
    return ", ".join(words) if words else ("no charge" if parts == 1 else "part without a charge")


def _solvers(equations: ChainEquations, neutral: bool) -> Iterator[tuple[SectorSolver, str]]:
    """A solver and a label for each part of the sectors to be searched."""
    for gap in differences(equations.groups):
        if neutral and any(gap):
            continue
        parts = part_generators(equations, whole_space(equations.groups, gap))
        for part in parts:
            label = _part_label(equations, part.space, len(parts))
            yield SectorSolver(equations, part.space, generator=part), label


def _mode(equations: ChainEquations, part: _PartLevels, vector: np.ndarray) -> np.ndarray:
    """An eigenvector as an operator (D, D) in the written basis, Frobenius norm 1."""
    if not part.space.hermitian:
        mode = component_matrix(equations, part.space, vector)
    else:
        mode = component_matrix(equations, part.space, np.ascontiguousarray(vector.real))
        if np.any(vector.imag):
            imaginary = np.ascontiguousarray(vector.imag)
            mode = mode + 1j * component_matrix(equations, part.space, imaginary)
    return np.asarray(mode / np.linalg.norm(mode))


def nearest_gap(
    model: Model, options: GapOptions, symmetries: SymmetryReport | None, tell: Tell
) -> GapResult:
    """The gap among the levels nearest to zero of each searched sector.

    Sectors of equal ket and bra charge, or all with ``options.populations_only = False``. A level
    farther from zero than ``reach`` (in ``methods``) could only be slower by oscillating at that
    frequency. Raises NotCertifiedError when starts disagree or residuals are too large.
    """
    generator = Lindbladian(model)
    zero = zero_tolerance(model)
    norm = max(generator.norm_bound, np.finfo(float).tiny)
    tolerance = defaults.GAP_NEAREST_TOLERANCE * norm
    neutral = options.populations_only is not False
    with limited_threads(1):
        equations = chain_equations(model, symmetries)
        closed = closed_chain(equations, zero)
        if closed is not None:
            return _closed_gap(model, closed, zero)
        parts = []
        for solver, label in _solvers(equations, neutral):
            if solver.space.size <= defaults.ITERATIVE_DENSE_SIZE:
                parts.append(_small_part(solver, label, zero))
            else:
                parts.append(_iterated_part(solver, label, zero, tolerance, options, tell))
        moving = [part for part in parts if part.levels.size]
        if not moving:
            raise NotCertifiedError(f"every level of {model.name} that was met is a zero mode")
        best = min(moving, key=lambda part: float(np.min(-part.levels.real)))
        index = int(np.argmin(-best.levels.real))
        level = complex(best.levels[index])
        mode = _mode(equations, best, best.vectors[index])
    residual = float(np.linalg.norm(generator.apply(mode) - level * mode)) / norm
    if level.imag < 0:
        level = level.conjugate()
        mode = mode.conj().T.copy()
    oscillating = sum(
        int(np.sum(np.abs(part.levels.real) <= zero)) * part.space.copies for part in parts
    )
    result = GapResult(
        gap=0.0 if oscillating else -level.real,
        eigenvalue=level,
        zero_modes=sum(part.zero_modes * part.space.copies for part in parts),
        oscillating_modes=oscillating,
        residual=residual,
        residual_space="density matrix",
        sector=best.label,
        searched=tuple(part.label for part in parts),
        methods=tuple(_method(part) for part in parts),
        sector_gaps=tuple(
            float(np.min(-part.levels.real)) if part.levels.size else None for part in parts
        ),
        slow_modes=_distinct(parts, zero),
        tolerance=zero,
        model=model,
        certified=residual <= defaults.GAP_RESIDUAL_TOLERANCE,
        scope=_scope(neutral, parts),
        applies=sum(part.applies for part in parts),
        mode=mode,
    )
    if not result.certified:
        raise NotCertifiedError(
            f"gap {result.gap:.9g} of {model.name} has residual {residual:.1e}, limit "
            f"{defaults.GAP_RESIDUAL_TOLERANCE:.0e}",
            result,
        )
    return result


def _closed_gap(model: Model, closed: ClosedChain, zero: float) -> GapResult:
    """Without dissipation every level lies on the imaginary axis."""
    oscillating = model.local_dimension ** (2 * model.sites) - closed.zero_modes
    finite = np.isfinite(closed.smallest)
    return GapResult(
        gap=0.0,
        eigenvalue=complex(0, closed.smallest) if finite else None,
        zero_modes=closed.zero_modes,
        oscillating_modes=oscillating,
        residual=0.0,
        residual_space="energies",
        sector="no dissipation",
        searched=("no dissipation",),
        methods=("differences of energies",),
        sector_gaps=(0.0 if finite else None,),
        slow_modes=np.array([complex(0, closed.smallest)] if finite else [], dtype=complex),
        tolerance=zero,
        model=model,
    )


def _method(part: _PartLevels) -> str:
    if part.dense:
        return "dense"
    return f"nearest to zero within {part.reach:.4g}, independent starts agree"


def _scope(neutral: bool, parts: list[_PartLevels]) -> str:
    where = "operators of equal ket and bra charge" if neutral else "all sectors"
    reach = min(part.reach for part in parts)
    if not np.isfinite(reach):
        return where
    return f"{where}; levels of modulus up to {reach:.4g}, faster oscillations are not searched"


def _distinct(parts: list[_PartLevels], zero: float) -> np.ndarray:
    """The slowest distinct levels, (<= GAP_LEVELS,) complex128, slowest first."""
    levels = np.concatenate([part.levels[: defaults.GAP_LEVELS] for part in parts])
    distinct: list[complex] = []
    for level in levels[np.lexsort((-levels.imag, np.abs(levels.imag), -levels.real))]:
        if all(abs(level - known) > 10 * zero for known in distinct):
            distinct.append(complex(level))
    return np.array(distinct[: defaults.GAP_LEVELS], dtype=complex)
