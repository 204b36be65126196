"""Cumulants of a counted current by perturbation of the steady state, and growth rates.

With ``L_chi = sum chi^n L_n / n!``, ``theta = sum chi^n c_n / n!`` and ``rho_chi`` of trace 1,

    ``L rho_n = sum_{k=1..n} C(n, k) (c_k - L_k) rho_{n-k}``,
    ``c_n = sum_{k=1..n} C(n, k) tr(L_k rho_{n-k})``

(C. Flindt, T. Novotny, A. Braggio, A.-P. Jauho, Phys. Rev. B 82, 155407 (2010); from memory).
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from math import comb

import numpy as np
import scipy.linalg
import scipy.special

from lbwork import defaults
from lbwork.counting.records import CountingStatistics, GrowthRates
from lbwork.counting.tilt import Tilt, bond_tilt, jump_tilt, local_terms
from lbwork.errors import NotCertifiedError, UsageError
from lbwork.generator import Lindbladian
from lbwork.iterative import (
    ChainEquations,
    SectorSolver,
    chain_equations,
    component_matrix,
    nearest_levels,
    whole_space,
)
from lbwork.iterative.action import LocalMap
from lbwork.iterative.space import hermitian_from_real
from lbwork.model import Model
from lbwork.observables.currents import spin_currents
from lbwork.provenance import limited_threads
from lbwork.spectrum.options import zero_tolerance
from lbwork.steady import iterative_states

__all__ = ["counting_statistics"]

Tell = Callable[[str], None]


class _TiltedSolver(SectorSolver):
    """``L_chi`` in place of ``L``, with the preconditioner of L."""

    extra: LocalMap | None = None

    def apply(self, vector: np.ndarray) -> np.ndarray:
        """``L_chi`` on a vector."""
        image = super().apply(vector)
        if self.extra is not None:
            image += self.extra.apply(vector)
        return image


def _map(equations: ChainEquations, solver: SectorSolver, terms: tuple) -> LocalMap:
    form = equations.form
    placed = local_terms(terms, form.rotation, form.dimension)
    return LocalMap(solver.space, placed, form)


def _cumulants(
    solver: SectorSolver, maps: Sequence[LocalMap], steady: np.ndarray, tell: Tell
) -> tuple[np.ndarray, np.ndarray]:
    """Cumulants 1..4 and the relative residuals of the three equations."""
    space = solver.space
    states = [steady]
    cumulants: list[float] = []
    residuals = []
    for order in range(1, len(maps) + 1):
        images = [
            comb(order, power) * maps[power - 1].apply(states[order - power])
            for power in range(1, order + 1)
        ]
        cumulants.append(float(sum(space.trace(image).real for image in images)))
        if order == len(maps):
            break
        right = -sum(images[1:], images[0])
        for power in range(1, order + 1):
            right = right + comb(order, power) * cumulants[power - 1] * states[order - power]
        size = float(np.linalg.norm(right))
        scale = sum(float(np.linalg.norm(image)) for image in images)
        if size <= 1e-13 * scale:
            states.append(np.zeros_like(steady))
            residuals.append(0.0)
            continue

        def progress(value: float, order: int = order, size: float = size) -> None:
            tell(f"cumulant {order + 1}, residual {value / size:.1e}")

        solved = solver.solve(
            right,
            defaults.COUNTING_TOLERANCE * size,
            progress=progress,
        )
        residuals.append(solved.residual / size)
        if not solved.converged:
            raise NotCertifiedError(
                f"the equation of cumulant {order + 1} stopped at a relative residual of "
                f"{residuals[-1]:.1e}; its chain is too slow"
            )
        states.append(solved.solution - space.trace(solved.solution).real * steady)
    return np.array(cumulants), np.array(residuals)


def _growth(
    equations: ChainEquations,
    solver: _TiltedSolver,
    tilt: Tilt,
    cumulants: np.ndarray,
    steady: np.ndarray,
    fields: Sequence[float],
    norm: float,
    tell: Tell,
) -> GrowthRates:
    """Leading levels of the tilted generator, each certified by a positive eigenoperator."""
    space = solver.space
    values, residuals, smallest = [], [], []
    for field in fields:
        if not np.isfinite(field):
            raise UsageError(f"counting field {field} is not a number")
        solver.extra = _map(equations, solver, tilt.difference(field))
        guess = sum(
            cumulant * field**order / float(scipy.special.factorial(order))
            for order, cumulant in enumerate(cumulants[:2], start=1)
        )

        def say(words: str, field: float = field) -> None:
            tell(f"field {field:g}: {words}")

        found = nearest_levels(
            solver,
            seed=1,
            tolerance=defaults.GAP_NEAREST_TOLERANCE * norm,
            # The leading level is the last one on the right; aim a little beyond it.
            target=max(float(guess), 0.0) + 0.05 * equations.decay,
            first=steady,
            ordered=1,
            limit=defaults.ITERATIVE_LIMIT,
            tell=say,
        )
        vector = found.vectors[0].real
        trace = space.trace(vector).real
        vector = vector / trace if trace else vector
        least = min(
            float(scipy.linalg.eigvalsh(hermitian_from_real(block), subset_by_index=[0, 0])[0])
            for block in space.blocks(vector)
        )
        values.append(float(found.levels[0].real))
        residuals.append(float(found.residuals[0]) / norm)
        smallest.append(least)
        if (
            least < -defaults.STEADY_NEGATIVITY
            or residuals[-1] > defaults.GAP_RESIDUAL_TOLERANCE
            or abs(found.levels[0].imag) > defaults.GAP_RESIDUAL_TOLERANCE * norm
        ):
            raise NotCertifiedError(
                f"field {field:g}: the level {found.levels[0]:.8g} found (residual "
                f"{residuals[-1]:.1e}, smallest eigenvalue {least:.1e}) is not the leading one; "
                "take smaller fields"
            )
    solver.extra = None
    return GrowthRates(
        np.array(fields, float), np.array(values), np.array(residuals), np.array(smallest)
    )


def counting_statistics(
    model: Model,
    *,
    jumps: Mapping[int, float] | None = None,
    bond: int | None = None,
    fields: Sequence[float] = (),
    tell: Tell | None = None,
) -> CountingStatistics:
    """Cumulant rates 1..4 of a jump count or of a bond current, and ``theta(chi)`` at ``fields``.

    ``jumps``: weight by number of the model's jump entry (from 1), e.g. ``{1: +1, 2: -1}``;
    ``bond``: magnetisation across a bond (from 1) instead. Times in units of 1/coupling. Raises
    UsageError unless exactly one of the two is given, NotCertifiedError where the steady state is
    not unique or an equation does not converge, CapacityError for chains that do not fit.
    """
    if (jumps is None) == (bond is None):
        raise UsageError("give either jumps or a bond to count")
    tilt = jump_tilt(model, jumps) if jumps is not None else bond_tilt(model, int(bond or 0))
    say = tell or (lambda words: None)
    generator = Lindbladian(model)
    with limited_threads(1):
        equations = chain_equations(model)
        found = iterative_states(equations, splitting=None, zero=zero_tolerance(model), tell=say)
        if len(found.components) > 1:
            raise NotCertifiedError(
                f"{model.name} has {len(found.components)} steady states; a mean current depends "
                "on the start, break the conserved charge first"
            )
        steady = found.components[0].vector
        solver = _TiltedSolver(
            equations,
            whole_space(equations.groups),
            splitting=found.splitting,
        )
        maps = [_map(equations, solver, tilt.derivative(order)) for order in range(1, 5)]
        cumulants, residuals = _cumulants(solver, maps, steady, say)
        density = component_matrix(equations, solver.space, steady)
        norm = max(generator.norm_bound, np.finfo(float).tiny)
        growth = None
        if len(fields):
            growth = _growth(equations, solver, tilt, cumulants, steady, fields, norm, say)
    current = difference = None
    if bond is not None:
        currents = spin_currents(model, density)
        if currents.current is not None:
            current = float(currents.current[bond - 1])
            difference = abs(current - float(cumulants[0]))
    steady_residual = float(np.linalg.norm(generator.apply(density)) / np.linalg.norm(density))
    return CountingStatistics(
        model=model,
        counted=tilt.name,
        cumulants=cumulants,
        residuals=residuals,
        steady_residual=steady_residual,
        steady_current=current,
        mean_difference=difference,
        growth=growth,
        applies=solver.applies + found.applies,
    )
