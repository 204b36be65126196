"""How a gap is sought, and what counts as zero."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from lbwork import defaults
from lbwork.errors import UsageError
from lbwork.generator import Lindbladian
from lbwork.model import Model

__all__ = ["GAP_METHODS", "GapOptions", "gap_method", "zero_tolerance"]

GAP_METHODS = ("auto", "exhaustive", "nearest")


@dataclass(frozen=True)
class GapOptions:
    """How the gap is sought.

    method: ``exhaustive`` (every level of small parts, the levels of largest real part of large
    ones), ``nearest`` (matrix-free, the levels nearest to zero; long chains) or ``auto`` (by size).
    populations_only: search only the sectors of equal ket and bra charge; None: where the method is
    ``nearest``. dense_dimension: largest part diagonalised densely. levels: slowest levels sought
    in larger parts. starts: independent start vectors there, at least 2. seed: of the start
    vectors. Raises UsageError for an unknown method.
    """

    dense_dimension: int = defaults.GAP_DENSE_DIMENSION
    levels: int = defaults.GAP_LEVELS
    starts: int = 2
    seed: int = 0
    populations_only: bool | None = None
    method: str = "auto"

    def __post_init__(self) -> None:
        if self.method not in GAP_METHODS:
            raise UsageError(f"method '{self.method}' is not one of {', '.join(GAP_METHODS)}")


def gap_method(model: Model, options: GapOptions) -> str:
    """``exhaustive`` or ``nearest``: what ``auto`` stands for at the size of this model."""
    if options.method != "auto":
        return options.method
    entries = model.local_dimension ** (2 * model.sites)
    return "exhaustive" if entries <= defaults.GAP_EXHAUSTIVE_SPACE else "nearest"


def zero_tolerance(model: Model) -> float:
    """Absolute size below which a level counts as zero: the tolerance times the norm bound."""
    return defaults.ZERO_MODE_TOLERANCE * max(Lindbladian(model).norm_bound, np.finfo(float).tiny)
