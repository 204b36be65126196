"""Numbers and names as they stand in a figure."""

from __future__ import annotations

import math

__all__ = ["interval_text", "reference_label", "with_uncertainty"]

_CLASSES = {
    "poisson": "Poisson",
    "A": "A",
    "AI+": r"$\mathrm{AI}^{\mathrm{\dagger}}$",
    "AII+": r"$\mathrm{AII}^{\mathrm{\dagger}}$",
}


def reference_label(name: str) -> str:
    """Name of a reference ensemble in print: "AI+" -> AI with a dagger, "A x2" -> A times 2."""
    base, _, copies = name.removeprefix("1d-").partition(" x")
    label = _CLASSES.get(base, base)
    return rf"{label} $\times{copies}$" if copies else label


def interval_text(value: float, low: float, high: float) -> str:
    """A value with its interval, to the digits the interval warrants: "0.738 [0.733, 0.744]"."""
    spread = high - low
    digits = 3 if spread <= 0 else min(6, max(1, 1 - math.floor(math.log10(spread))))
    text = f"{value:.{digits}f} [{low:.{digits}f}, {high:.{digits}f}]"
    return text.replace("-", "\N{MINUS SIGN}")


def with_uncertainty(value: float, error: float) -> str:
    """Value with its standard error in the last digit: 2.0134, 0.028 -> "2.01(3)".

    An error that rounds to zero at six decimals, or is not finite, is left out.
    """
    if not math.isfinite(error) or error < 5e-7:
        return f"{value:.4g}"
    digits = max(0, -math.floor(math.log10(error)))
    scaled = round(error * 10**digits)
    if scaled == 10 and digits > 0:
        digits, scaled = digits - 1, 1
    return f"{value:.{digits}f}({scaled})"
