"""The sector plan of a model and the matrix of the generator in each sector."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

import numpy as np
import scipy.sparse as sparse

from lbwork import defaults
from lbwork.errors import SymmetryError
from lbwork.model import Model
from lbwork.symmetry.block import (
    OrbitBasis,
    assemble_block,
    check_block,
    entry_scale,
    real_form,
    sector_isometry,
)
from lbwork.symmetry.characters import AbelianGroup, group_from_generators
from lbwork.symmetry.local_basis import doubled_rotation
from lbwork.symmetry.report import SymmetryReport, find_symmetries
from lbwork.symmetry.sector_basis import (
    build_basis,
    digits_of,
    numbers_of,
    require_numberable,
)
from lbwork.symmetry.sectors import Sector, list_sectors

__all__ = ["SectorBlock", "SectorPlan", "plan_sectors"]


@dataclass(frozen=True, eq=False)
class SectorBlock:
    """The generator in one sector: ``matrix = isometry^dag L isometry``, ``L V = V B``.

    ``matrix`` is csr (n, n), float64 when the sector is self-conjugate (Hermitian basis) and
    complex128 otherwise. ``mismatch`` is the sampled relative error of ``L V x = V B x``, evaluated
    on rows of L that were not used in the assembly.
    """

    sector: Sector
    matrix: sparse.csr_matrix
    mismatch: float
    _orbits: OrbitBasis = field(repr=False)
    _unitary: sparse.csr_matrix | None = field(repr=False)
    _group: AbelianGroup = field(repr=False)
    _rotation: np.ndarray | None = field(repr=False)

    @property
    def transposition(self) -> str:
        """``symmetric``, ``antisymmetric`` or ``none``; see :class:`Sector`."""
        return self.sector.transposition

    @cached_property
    def isometry(self) -> sparse.csr_matrix:
        """Sector vectors on the doubled chain, in the basis the model is written in.

        Complex csr (d**(2L), n) with orthonormal columns, site 1 most significant. When the charges
        needed a rotation of the on-site basis the columns are dense.
        """
        columns = self._sector_columns()
        if self._rotation is None:
            return columns
        sites = self._orbits.sites
        rotated = columns
        for site in range(sites):
            left = self._orbits.base**site
            right = self._orbits.base ** (sites - site - 1)
            local = doubled_rotation(self._rotation[site % len(self._rotation)])
            placed = sparse.kron(
                sparse.identity(left), sparse.kron(local, sparse.identity(right)), format="csr"
            )
            rotated = (placed @ rotated).tocsr()
        return rotated

    def _sector_columns(self) -> sparse.csr_matrix:
        orbits = self._orbits
        digits = digits_of(orbits.states, orbits.sites, orbits.base)
        images = [
            numbers_of(element.apply(digits)[0], orbits.base) for element in self._group.elements
        ]
        columns = sector_isometry(orbits, np.unique(np.concatenate(images)))
        return columns if self._unitary is None else (columns @ self._unitary).tocsr()


@dataclass(frozen=True, eq=False)
class SectorPlan:
    """Which sectors a model has. ``total_dimension`` is ``d**(2L)``."""

    model: Model
    symmetries: SymmetryReport
    sectors: tuple[Sector, ...]

    @property
    def total_dimension(self) -> int:
        """Dimension of the space of density matrices."""
        return self.symmetries.base**self.model.sites

    @property
    def largest(self) -> int:
        """Dimension of the largest sector."""
        return max(sector.dimension for sector in self.sectors)

    def block(self, sector: Sector) -> SectorBlock:
        """Assemble the generator in one sector.

        Raises SymmetryError when QuSpin's basis has another size than the characters say, or when
        the block does not reproduce the generator on sampled rows.
        """
        report = self.symmetries
        sites, base = self.model.sites, report.base
        basis = build_basis(
            report.charges,
            sector.charge_label,
            sector.generators,
            sector.irrep,
            sites,
            base,
            sector.dimension,
        )
        orbits = OrbitBasis(basis, bool(sector.generators), sites, base)
        if orbits.dimension != sector.dimension:
            raise SymmetryError(
                f"sector '{sector.label}' has {orbits.dimension} basis states, "
                f"characters say {sector.dimension}"
            )
        matrix = assemble_block(report.rows, report.constant, orbits)
        group = group_from_generators(sector.generators, sites, base)
        step = max(group.order // 3, 1)
        mismatch = check_block(report.rows, report.constant, matrix, orbits, group.elements[::step])
        if mismatch > defaults.SYMMETRY_TOLERANCE:
            raise SymmetryError(
                f"sector '{sector.label}' is not invariant: mismatch {mismatch:.1e} above "
                f"{defaults.SYMMETRY_TOLERANCE:.0e}"
            )
        unitary = None
        if sector.reality is not None:
            scale = entry_scale(report.rows)
            matrix, unitary = real_form(matrix, sector.reality, orbits, scale)
        return SectorBlock(sector, matrix, mismatch, orbits, unitary, group, report.rotation)

    def to_dict(self) -> dict[str, Any]:
        """A JSON document: symmetries, sectors, total dimension."""
        return {
            "total_dimension": self.total_dimension,
            "symmetries": self.symmetries.to_dict(),
            "sectors": [sector.to_dict() for sector in self.sectors],
        }

    def __str__(self) -> str:
        lines = [str(self.symmetries), f"{len(self.sectors)} sectors of {self.total_dimension}:"]
        lines += [
            f"  {sector.dimension:7d} x {sector.multiplicity:<4d} "
            f"{'real   ' if sector.self_conjugate else 'complex'} {sector.label}"
            for sector in self.sectors
        ]
        return "\n".join(lines)


def plan_sectors(model: Model) -> SectorPlan:
    """Find the symmetries of a model and list its sectors.

    The dimensions times multiplicities add up to ``d**(2L)``; SymmetryError otherwise. Raises
    CapacityError when basis states cannot be numbered with 64 bits.
    """
    require_numberable(model.sites, model.local_dimension**2)
    report = find_symmetries(model)
    return SectorPlan(model, report, list_sectors(report))
