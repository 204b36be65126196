"""Zero modes of the generator in all sectors that can have one, counted with their copies."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from lbwork import defaults
from lbwork.errors import NotCertifiedError
from lbwork.spectrum.options import zero_tolerance
from lbwork.spectrum.parts import irreducible_parts, rounding_scale
from lbwork.spectrum.populations import population_labels
from lbwork.steady.kernel import SectorKernel, sector_kernel
from lbwork.symmetry import Sector, SectorBlock, SectorPlan

__all__ = ["SectorZeroModes", "ZeroModes", "neutral", "zero_modes"]


@dataclass(frozen=True, eq=False)
class SectorZeroModes:
    """Zero modes of one sector with the block they were found in."""

    block: SectorBlock
    kernel: SectorKernel

    @property
    def sector(self) -> Sector:
        """The sector."""
        return self.block.sector


@dataclass(frozen=True, eq=False)
class ZeroModes:
    """Zero modes found in the searched sectors.

    count: with the copies of each sector. separation: smallest size of any other mode that was met
    (singular value or eigenvalue). ``with_modes``: sectors that have zero modes. ``excluded``:
    labels of sectors that were not searched since they cannot have one.
    """

    count: int
    separation: float
    with_modes: tuple[SectorZeroModes, ...]
    searched: tuple[str, ...]
    excluded: tuple[str, ...]
    method: str


def neutral(plan: SectorPlan, sector: Sector, kinds: tuple[str, ...]) -> bool:
    """Whether a sector has the charges of some population, as far as charges of ``kinds`` go."""
    chosen = [index for index, charge in enumerate(plan.symmetries.charges) if charge.kind in kinds]
    reached = {tuple(label[index] for index in chosen) for label in population_labels(plan)}
    return tuple(sector.charge_label[index] for index in chosen) in reached


def _unshifting(plan: SectorPlan, sector: Sector) -> bool:
    """Whether a sector has the continuous charges of some population.

    Other sectors hold operators that shift a conserved on-site charge. If the steady state among
    the neutral ones is unique and has full rank, these have no zero mode: the zero modes of the
    adjoint are then an algebra under multiplication, so a mode X of non-zero charge would have
    ``X^dag X`` and ``X X^dag`` proportional to 1, and a unitary cannot shift a bounded charge.
    """
    chosen = [
        index
        for index, charge in enumerate(plan.symmetries.charges)
        if charge.modulus == 0 and charge.kind != "superoperator"
    ]
    reached = {tuple(label[index] for index in chosen) for label in population_labels(plan)}
    return tuple(sector.charge_label[index] for index in chosen) in reached


def zero_modes(
    plan: SectorPlan,
    *,
    filtered: bool | None = None,
    full_rank: Callable[[SectorZeroModes], bool] | None = None,
    progress: Callable[[int, int, Sector], None] | None = None,
) -> ZeroModes:
    """Search the neutral sectors for zero modes, then all others unless theory excludes them.

    ``filtered`` forces the Krylov search or the factorisation, None chooses by size.
    ``full_rank(found)`` tells whether a unique neutral steady state has full rank; without it every
    sector is searched. Raises NotCertifiedError when no zero mode is found; every generator has
    one.
    """
    tolerance = zero_tolerance(plan.model)
    first = [sector for sector in plan.sectors if _unshifting(plan, sector)]
    rest = [sector for sector in plan.sectors if not _unshifting(plan, sector)]
    found: list[SectorZeroModes] = []
    separation, methods = np.inf, set()
    excluded: list[Sector] = []
    searched: list[str] = []
    for done, sector in enumerate([*first, *rest]):
        if done == len(first) and full_rank is not None:
            unique = len(found) == 1 and found[0].kernel.count * found[0].sector.multiplicity == 1
            if unique and full_rank(found[0]):
                excluded = rest
                break
        if progress is not None:
            progress(done, len(plan.sectors), sector)
        block = plan.block(sector)
        scale = rounding_scale(plan, block.matrix)
        iterate = sector.dimension > defaults.STEADY_DENSE_DIMENSION
        parts = irreducible_parts(block.matrix, scale)
        kernel = sector_kernel(
            block,
            scale,
            tolerance,
            filtered=iterate if filtered is None else filtered,
            irreducible=parts.sizes.size == 1,
        )
        separation = min(separation, kernel.separation)
        methods.add(kernel.method)
        searched.append(sector.label)
        if kernel.count:
            found.append(SectorZeroModes(block, kernel))
    count = sum(item.kernel.count * item.sector.multiplicity for item in found)
    if count == 0:
        raise NotCertifiedError(
            f"no zero mode of {plan.model.name} below {tolerance:.1e}; scale the model to "
            "couplings of order 1"
        )
    return ZeroModes(
        count=count,
        separation=separation,
        with_modes=tuple(found),
        searched=tuple(searched),
        excluded=tuple(sector.label for sector in excluded),
        method=_words(methods, len(searched), bool(excluded)),
    )


def _words(methods: set[str], searched: int, excluded: bool) -> str:
    how = {
        "factorised": "inverse iteration",
        "filtered": "Krylov search from independent starts",
    }
    text = f"{' and '.join(how[method] for method in sorted(methods))} in {searched} sectors"
    if excluded:
        text += "; charged sectors excluded because the neutral state is unique and of full rank"
    return text
