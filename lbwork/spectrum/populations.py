"""Which sectors can hold populations, that is carry a trace."""

from __future__ import annotations

from dataclasses import replace

from lbwork.symmetry import Sector, SectorPlan
from lbwork.symmetry.charges import charge_sectors

__all__ = ["population_labels", "population_sectors"]


def population_labels(plan: SectorPlan) -> frozenset[tuple[int, ...]]:
    """Charge labels of the basis states ``|a><a|``: those a density matrix with a trace needs.

    A rotation of the on-site basis leaves the identity as it is, so this holds in any basis.
    """
    dimension = plan.model.local_dimension
    charges = [
        replace(charge, values=charge.values[:, :: dimension + 1])
        for charge in plan.symmetries.charges
    ]
    return frozenset(charge_sectors(charges, plan.model.sites, dimension))


def population_sectors(plan: SectorPlan) -> tuple[Sector, ...]:
    """Sectors whose charges are those of some population, whatever their momentum or parity."""
    labels = population_labels(plan)
    return tuple(sector for sector in plan.sectors if sector.charge_label in labels)
