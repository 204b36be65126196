"""Level statistics: complex spacing ratios and spacings of irreducible sectors, and the verdict.

One :class:`LevelSequence` per symmetry sector goes into :func:`level_statistics`; the result goes
into :func:`judge_levels`. The verdict compares averages of per-level quantities with reference
ensembles that went through the same cleaning and the same bulk cut.
"""

from lbwork.levels.decision import SequenceVerdict
from lbwork.levels.form_factor import dissipative_form_factor
from lbwork.levels.intervals import Interval
from lbwork.levels.records import (
    LevelOptions,
    LevelSequence,
    LevelStatistics,
    SequenceStatistics,
)
from lbwork.levels.references import reference, reference_density, reference_names
from lbwork.levels.statistics import level_statistics
from lbwork.levels.verdict import Verdict, judge_levels

__all__ = [
    "Interval",
    "LevelOptions",
    "LevelSequence",
    "LevelStatistics",
    "SequenceStatistics",
    "SequenceVerdict",
    "Verdict",
    "dissipative_form_factor",
    "judge_levels",
    "level_statistics",
    "reference",
    "reference_density",
    "reference_names",
]
