"""One root for every error a user can cause, with builtin cousins.

The command line turns any :class:`LbworkError` into one line on stderr and an exit status;
everything else is a bug and keeps its traceback.
"""

from __future__ import annotations

__all__ = [
    "CapacityError",
    "ExpressionError",
    "LbworkError",
    "ModelError",
    "NotCertifiedError",
    "StoreError",
    "SymmetryError",
    "UsageError",
]


class LbworkError(Exception):
    """Root of all lbwork errors; ``exit_code`` is the process status the command line returns."""

    exit_code = 1


class UsageError(LbworkError, ValueError):
    """The command line or a function was called with words it does not know (exit status 2)."""

    exit_code = 2


class ModelError(LbworkError, ValueError):
    """A model is not legal: the message names the place, the value and the way out."""


class ExpressionError(ModelError):
    """An expression in a model does not parse or does not evaluate."""


class SymmetryError(LbworkError, ValueError):
    """A claimed symmetry is not one, or sectors do not add up to the whole space."""


class CapacityError(LbworkError, MemoryError):
    """A task would not fit in memory, or would exceed a stated limit; refused before it starts."""


class NotCertifiedError(LbworkError, ArithmeticError):
    """A computed number failed its certificate; ``partial`` carries what was computed, if any."""

    def __init__(self, message: str, partial: object | None = None) -> None:
        super().__init__(message)
        self.partial = partial


class StoreError(LbworkError, OSError):
    """A run file is damaged, locked, newer than this program, or cannot be written."""
