"""Linear equations with the generator in one sector, and the parts that a sector falls into."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from lbwork import defaults
from lbwork.iterative.action import SectorGenerator
from lbwork.iterative.dissipator import DissipatorResolvent, mean_decay
from lbwork.iterative.effective import EffectiveResolvent
from lbwork.iterative.gmres import LinearMap, LinearSolution, gmres
from lbwork.iterative.groups import KetGroups, ket_groups
from lbwork.iterative.hamiltonian import HamiltonianResolvent, energy_basis
from lbwork.iterative.local_form import LocalForm, local_form
from lbwork.iterative.resources import choose_resources
from lbwork.iterative.space import SectorSpace
from lbwork.model import Model
from lbwork.symmetry import SymmetryReport, find_symmetries

__all__ = ["SPLITTINGS", "ChainEquations", "SectorSolver", "chain_equations", "part_generators"]

SPLITTINGS = ("energy", "no-jump")
"""``energy``: (s + i ad_H)(s - D); ``no-jump``: the Sylvester operator of Heff."""


@dataclass(frozen=True, eq=False)
class ChainEquations:
    """A model prepared for matrix-free work: local form and groups of kets by charge."""

    model: Model
    symmetries: SymmetryReport
    form: LocalForm
    groups: KetGroups

    @cached_property
    def decay(self) -> float:
        """Mean of the diagonal of ``sum_k g_k l_k^dag l_k``."""
        return mean_decay(self.form)


def chain_equations(model: Model, symmetries: SymmetryReport | None = None) -> ChainEquations:
    """Find the charges of a model and write it in their basis."""
    report = find_symmetries(model, charges_only=True) if symmetries is None else symmetries
    return ChainEquations(model, report, local_form(model, report.rotation), ket_groups(report))


def part_generators(equations: ChainEquations, space: SectorSpace) -> list[SectorGenerator]:
    """The generators of the parts of a sector that no jump joins, each with its ``space``."""
    whole = SectorGenerator(space, equations.form)
    parts = whole.components()
    if len(parts) == 1:
        return [whole]
    return [SectorGenerator(space.with_pairs(part), equations.form) for part in parts]


class SectorSolver:
    """The generator in one sector with a preconditioner, in the precision that memory allows.

    ``generator``: that of the sector, where it has been put together already.
    """

    def __init__(
        self,
        equations: ChainEquations,
        space: SectorSpace,
        *,
        generator: SectorGenerator | None = None,
        splitting: str = "energy",
    ) -> None:
        self.space = space
        self.sites, self.dimension = equations.form.sites, equations.form.dimension
        self.generator = generator or SectorGenerator(space, equations.form)
        self.applies = 0
        resources = choose_resources(space)
        self.restart, precision = resources.restart, resources.precision
        kind = precision if space.hermitian else np.result_type(precision, np.complex64)
        self.precision = np.dtype(kind)
        scale = equations.decay
        if splitting == "no-jump":
            effective = EffectiveResolvent(
                space, equations.form.no_jump, defaults.ITERATIVE_DARK_SHIFT * scale
            )
            self._precondition: LinearMap = effective.apply
            return
        shift = defaults.ITERATIVE_SHIFT * scale
        basis = energy_basis(equations.form.hamiltonian, space, precision)
        energy = HamiltonianResolvent(space, basis, shift)
        dissipator = DissipatorResolvent(space, equations.form, shift, precision)

        def precondition(vector: np.ndarray) -> np.ndarray:
            result = energy.apply(dissipator.apply(vector))
            result *= vector.dtype.type(-shift)
            return result

        self._precondition = precondition

    def apply(self, vector: np.ndarray) -> np.ndarray:
        """``L`` on a vector."""
        return self.generator.apply(vector)

    def precondition(self, vector: np.ndarray) -> np.ndarray:
        """An approximation of ``L^-1`` on a vector; counted in ``applies``."""
        self.applies += 1
        return self._precondition(vector)

    def solve(
        self,
        right_side: np.ndarray,
        target: float,
        *,
        limit: int = defaults.ITERATIVE_LIMIT,
        restart: int | None = None,
        start: np.ndarray | None = None,
        progress: Callable[[float], None] | None = None,
    ) -> LinearSolution:
        """``L x = b`` to ``||b - L x|| <= target``; b must have no part along left zero modes.

        With ``start`` and ``b = -L start``: to ``||L (start + x)|| <= target ||start + x||``.
        """
        return gmres(
            self.apply,
            self.precondition,
            right_side,
            target=target,
            restart=restart or self.restart,
            limit=limit,
            precision=self.precision.type,
            start=start,
            progress=progress,
        )
