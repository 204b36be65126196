"""Figures that go into a paper as they are, and tables for the page.

Each figure is a function of plain arrays that returns a :class:`matplotlib.figure.Figure`;
:func:`figures_of` draws everything a result holds, and :func:`save_figure` writes PDF, SVG or PNG
with equal bytes for equal figures.
"""

from lbwork.report.adapters import figures_of, figures_of_run
from lbwork.report.level_figures import plane_references
from lbwork.report.line_ratios import gap_ratio_density, gap_ratio_figure, means_figure
from lbwork.report.profiles import profile_figure
from lbwork.report.ratios import ratio_figure
from lbwork.report.saving import FORMATS, save_figure
from lbwork.report.scaling import gap_figure, sector_figure
from lbwork.report.spectra import spectrum_figure
from lbwork.report.style import DOUBLE_COLUMN_MM, PALETTE, SINGLE_COLUMN_MM, journal_style
from lbwork.report.tables import html_table

__all__ = [
    "DOUBLE_COLUMN_MM",
    "FORMATS",
    "PALETTE",
    "SINGLE_COLUMN_MM",
    "figures_of",
    "figures_of_run",
    "gap_figure",
    "gap_ratio_density",
    "gap_ratio_figure",
    "html_table",
    "journal_style",
    "means_figure",
    "plane_references",
    "profile_figure",
    "ratio_figure",
    "save_figure",
    "sector_figure",
    "spectrum_figure",
]
