"""The verbs, in the order of the work. Each module has ``NAME`` and ``run``."""

from types import ModuleType

from lbwork.cli.verbs import (
    about,
    audit,
    catalogue,
    compare,
    count,
    export,
    figure,
    gap,
    inspect,
    levels,
    relax,
    runs,
    show,
    spectrum,
    steady,
)

__all__ = [
    "ALL",
    "about",
    "audit",
    "catalogue",
    "compare",
    "count",
    "export",
    "figure",
    "gap",
    "inspect",
    "levels",
    "relax",
    "runs",
    "show",
    "spectrum",
    "steady",
]

ALL: tuple[ModuleType, ...] = (
    catalogue,
    inspect,
    spectrum,
    levels,
    gap,
    steady,
    count,
    relax,
    audit,
    runs,
    show,
    compare,
    figure,
    export,
    about,
)
