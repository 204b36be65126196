"""Symmetries of a Lindblad generator, found by computation, and the sectors they make."""

from lbwork.symmetry.charges import Charge
from lbwork.symmetry.discrete import DiscreteSymmetry
from lbwork.symmetry.hidden import UnresolvedSymmetry
from lbwork.symmetry.plan import SectorBlock, SectorPlan, plan_sectors
from lbwork.symmetry.report import SymmetryReport, find_symmetries
from lbwork.symmetry.sectors import Sector

__all__ = [
    "Charge",
    "DiscreteSymmetry",
    "Sector",
    "SectorBlock",
    "SectorPlan",
    "SymmetryReport",
    "UnresolvedSymmetry",
    "find_symmetries",
    "plan_sectors",
]
