"""The tasks that a user gives: inspect, spectrum, levels, audit, kept as runs."""

from lbwork.study.audit import Audit, audit
from lbwork.study.comparison import Comparison, compare_runs
from lbwork.study.gap_range import GapRange, gap_range
from lbwork.study.inspection import Inspection, inspect_model
from lbwork.study.kept import keep_result, model_of_run, start_run
from lbwork.study.sequences import level_sequences
from lbwork.study.spectra import kept_spectrum, spectrum_of_run

__all__ = [
    "Audit",
    "Comparison",
    "GapRange",
    "Inspection",
    "audit",
    "compare_runs",
    "gap_range",
    "inspect_model",
    "keep_result",
    "kept_spectrum",
    "level_sequences",
    "model_of_run",
    "spectrum_of_run",
    "start_run",
]
