"""Checks of the numbers that the closed forms take: argument, value and the way out."""

from __future__ import annotations

import math
from typing import Any

from lbwork.errors import CapacityError, ModelError

__all__ = ["checked_count", "checked_density", "checked_finite", "checked_rate"]


def checked_count(name: str, value: Any, least: int, most: int | None = None) -> int:
    """A whole number in ``least..most``; ModelError below, CapacityError above."""
    if isinstance(value, bool) or not isinstance(value, int):
        # NumPy integers are whole numbers too.
        if isinstance(value, bool) or not hasattr(value, "__index__"):
            raise ModelError(f"{name} = {value!r} is not a whole number; give one from {least} on")
        value = value.__index__()
    if value < least:
        raise ModelError(f"{name} = {value} is too small; give a whole number from {least} on")
    if most is not None and value > most:
        raise CapacityError(f"{name} = {value} is beyond the limit of {most}; use a smaller one")
    return int(value)


def checked_finite(name: str, value: Any) -> float:
    """A finite real number; raises ModelError."""
    if not isinstance(value, int | float) and not hasattr(value, "__float__"):
        raise ModelError(f"{name} = {value!r} is not a real number; give a finite one")
    number = float(value)
    if not math.isfinite(number):
        raise ModelError(f"{name} = {number} is not finite; give a finite number")
    return number


def checked_rate(name: str, value: Any, zero: bool = False) -> float:
    """A finite rate > 0, or >= 0 with ``zero``; raises ModelError."""
    number = checked_finite(name, value)
    if number < 0 or (number == 0 and not zero):
        bound = ">= 0" if zero else "> 0"
        raise ModelError(f"{name} = {number:g} is not a rate {bound}; give such a number")
    return number


def checked_density(name: str, value: Any) -> float:
    """A density in [0, 1]; raises ModelError."""
    number = checked_finite(name, value)
    if not 0 <= number <= 1:
        raise ModelError(f"{name} = {number:g} is not a density; give a number from 0 to 1")
    return number
