"""Full counting statistics of jump and bond currents from the tilted generator."""

from lbwork.counting.records import CountingStatistics, GrowthRates
from lbwork.counting.statistics import counting_statistics
from lbwork.counting.tilt import Tilt, bond_tilt, jump_tilt

__all__ = [
    "CountingStatistics",
    "GrowthRates",
    "Tilt",
    "bond_tilt",
    "counting_statistics",
    "jump_tilt",
]
