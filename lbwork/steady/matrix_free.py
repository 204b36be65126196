"""Steady states by Krylov iteration, one for each part of the chain's space that jumps join."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import scipy.linalg

from lbwork import defaults
from lbwork.errors import NotCertifiedError
from lbwork.iterative import (
    ChainEquations,
    SectorSolver,
    SectorSpace,
    choose_splitting,
    dense_matrix,
    differences,
    part_generators,
    probe_kernel,
    whole_space,
)
from lbwork.iterative.space import hermitian_from_real

__all__ = ["ComponentState", "DegenerateComponent", "IterativeStates", "iterative_states"]

Tell = Callable[[str], None]


class DegenerateComponent(NotCertifiedError):
    """A part of the space has more than one steady state; another method must tell them apart."""


@dataclass(frozen=True, eq=False)
class ComponentState:
    """The steady state of one component: ``vector`` of its space, trace 1."""

    space: SectorSpace
    vector: np.ndarray
    separation: float

    @cached_property
    def eigenvalues(self) -> np.ndarray:
        """Eigenvalues of the density matrix, block by block, ascending in each."""
        return np.concatenate(
            [
                scipy.linalg.eigvalsh(hermitian_from_real(block), overwrite_a=True)
                for block in self.space.blocks(self.vector)
            ]
        )


@dataclass(frozen=True, eq=False)
class IterativeStates:
    """All components' steady states; ``coherences``: zero modes between them (and other sectors
    that theory does not exclude); ``applies`` of the solution, ``probe_applies`` of the search for
    further zero modes."""

    equations: ChainEquations
    components: tuple[ComponentState, ...]
    coherences: int
    separation: float
    splitting: str
    applies: int
    probe_applies: int
    method: str


def _small_kernel(solver: SectorSolver, zero: float) -> tuple[np.ndarray, float]:
    """Null vectors (n, m) of a small component by singular values, and the next value."""
    _, values, right = np.linalg.svd(dense_matrix(solver))
    null = int(np.sum(values <= zero))
    following = float(values[-null - 1]) if null < values.size else np.inf
    return right[values.size - null :].conj().T, following


def _component_state(
    solver: SectorSolver, zero: float, tell: Tell
) -> tuple[np.ndarray, float, int, int]:
    """Steady vector of trace 1, separation, applications of solution and of probe."""
    space = solver.space
    if space.size <= defaults.ITERATIVE_DENSE_SIZE:
        kernel, following = _small_kernel(solver, zero)
        if kernel.shape[1] != 1:
            raise DegenerateComponent(
                f"a part of size {space.size} has {kernel.shape[1]} steady states"
            )
        vector = kernel[:, 0]
        return vector / space.trace(vector).real, following, 0, 0
    start = space.identity()
    start /= space.trace(start).real
    size = float(np.linalg.norm(start))
    vector = start
    right = -solver.apply(start)
    if np.linalg.norm(right) > 1e-3 * defaults.ITERATIVE_TOLERANCE * size:
        solved = solver.solve(
            right,
            defaults.ITERATIVE_TOLERANCE,
            start=start,
            progress=lambda value: tell(
                f"{solver.applies} applications, residual {value / size:.1e}"
            ),
        )
        vector = start + solved.solution
        vector /= space.trace(vector).real
    applies = solver.applies
    probe = probe_kernel(
        solver,
        [(space.identity(), vector)],
        seed=1,
        zero=zero,
        tell=tell,
    )
    if probe.separation <= zero:
        raise DegenerateComponent(
            f"a part of size {space.size} has a second zero mode ({probe.separation:.1e})"
        )
    return vector, probe.separation, applies, probe.applies


def _same_spectrum(first: ComponentState, second: ComponentState) -> bool:
    """Whether two density matrices have the same non-zero eigenvalues."""
    # The purity tells most pairs apart without an eigenvalue.
    one, other = (float(np.vdot(state.vector, state.vector)) for state in (first, second))
    if not np.isclose(one, other, rtol=1e-6):
        return False
    weights, others = (
        np.sort(values[values > defaults.STEADY_POSITIVE])
        for values in (first.eigenvalues, second.eigenvalues)
    )
    return weights.size == others.size and bool(np.allclose(weights, others, rtol=1e-5, atol=1e-9))


def _open_sectors(
    equations: ChainEquations, components: list[list[int]], states: list[ComponentState]
) -> Iterator[SectorSpace]:
    """Sectors of non-zero charge difference in which zero modes are possible.

    Zero modes form blocks ``M_n x omega`` (B. Baumgartner, H. Narnhofer, J. Phys. A 41, 395303
    (2008); from memory). A continuous symmetry acts on a block by rotations inside it, so when each
    component has one neutral zero mode, every weak charge shift is excluded; coherences between two
    components join states with equal spectra. Cyclic charges allow more and are left open.
    """
    groups = equations.groups
    part_of = {}
    for number, chosen in enumerate(components):
        for group in chosen:
            part_of[group] = number
    continuous = groups.moduli == 0
    for gap in differences(groups):
        if not any(gap):
            continue
        space = whole_space(groups, gap)
        joins: dict[tuple[int, int], list[int]] = {}
        for index, (ket, bra) in enumerate(space.pairs):
            joins.setdefault((part_of[ket], part_of[bra]), []).append(index)
        for (first, second), chosen in joins.items():
            if first == second:
                if np.any(np.array(gap)[continuous]):
                    continue
            elif not _same_spectrum(states[first], states[second]):
                continue
            yield space.with_pairs(chosen)


def _coherences(
    equations: ChainEquations,
    components: list[list[int]],
    states: list[ComponentState],
    zero: float,
) -> tuple[int, float, int, int]:
    """Zero modes in charged sectors, the slowest other mode, sectors searched, applications."""
    count, separation, searched, applies = 0, np.inf, 0, 0
    for space in _open_sectors(equations, components, states):
        searched += 1
        solver = SectorSolver(equations, space)
        if space.size <= defaults.ITERATIVE_DENSE_SIZE:
            kernel, following = _small_kernel(solver, zero)
            count += space.copies * kernel.shape[1]
            separation = min(separation, following)
            continue
        probe = probe_kernel(solver, [], seed=2, zero=zero)
        applies += probe.applies
        if probe.separation <= zero:
            raise DegenerateComponent(
                f"coherences of charge difference {space.difference} (size {space.size}) do not "
                "decay"
            )
        separation = min(separation, probe.separation)
    return count, separation, searched, applies


def iterative_states(
    equations: ChainEquations, *, splitting: str | None, zero: float, tell: Tell
) -> IterativeStates:
    """Steady states of all components, with the zero modes counted.

    ``zero``: ``||L z||`` of a unit vector below which it is a zero mode. Raises DegenerateComponent
    where one component has several, CapacityError where vectors do not fit.
    """
    chosen = choose_splitting(equations) if splitting is None else splitting
    components = part_generators(equations, whole_space(equations.groups))
    states: list[ComponentState] = []
    applies = probes = 0
    for number, part in enumerate(components, start=1):
        solver = SectorSolver(equations, part.space, generator=part, splitting=chosen)
        prefix = f"part {number} of {len(components)}: " if len(components) > 1 else ""

        def say(text: str, prefix: str = prefix) -> None:
            tell(prefix + text)

        vector, separation, cost, probe_cost = _component_state(solver, zero, say)
        states.append(ComponentState(solver.space, vector, separation))
        applies += cost
        probes += probe_cost
    ket_parts = [[ket for ket, _ in part.space.pairs] for part in components]
    coherences, separation, searched, cost = _coherences(equations, ket_parts, states, zero)
    words = "random starts freed of decaying modes"
    if len(components) > 1:
        words += f" in each of {len(components)} parts with conserved charges"
    words += (
        f" and in {searched} charged sectors; the others are excluded by theory"
        if searched
        else "; charged sectors are excluded by theory"
    )
    return IterativeStates(
        equations=equations,
        components=tuple(states),
        coherences=coherences,
        separation=min(separation, *(state.separation for state in states)),
        splitting=chosen,
        applies=applies,
        probe_applies=probes + cost,
        method=words,
    )
