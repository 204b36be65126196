"""The canonical form of a model: what it is, however it was written.

H is expanded in strings (:mod:`lbwork.model.strings`) and added up, so the way a Hamiltonian is cut
into terms does not matter. Each jump is expanded alike and split into a rate and an operator with
fixed phase and norm; jumps that are multiples of each other become one.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

from lbwork.model.places import PlacedJump, PlacedOperator
from lbwork.model.strings import String, operator_strings, total_strings

__all__ = ["canonical_document"]

DIGITS = 12
"""Significant digits of the largest coefficient that are kept."""

SMALLEST = 1e-250
"""Smaller coefficients count as zero, since their last digits cannot be represented."""

# A plain 1/2 would put the ties of rounding on short binary fractions such as 1/8192, where the
# rounding errors of two ways of writing the same number would decide.
_HALF = 0.5137

Entry = tuple[String, float, float]


class _Grid:
    """Rounding to ``DIGITS`` digits of a largest value."""

    def __init__(self, scale: float) -> None:
        # Formatted first, so that 0.99999999999999 and 1 have the same decade.
        decade = int(f"{scale:.{DIGITS - 1}e}".partition("e")[2])
        self.exponent = decade - DIGITS + 1
        self.unit = 10.0**self.exponent

    def rounded(self, value: float) -> float:
        return float(f"{math.floor(value / self.unit + _HALF)}e{self.exponent}")


def _hamiltonian(operators: Sequence[PlacedOperator], dimension: int) -> list[list[Any]]:
    strings = total_strings(operators, dimension)
    total = {string: value.real for string, value in strings.items() if string}
    scale = max((abs(value) for value in total.values()), default=0.0)
    if scale < SMALLEST:
        return []
    grid = _Grid(scale)
    rounded = ((string, grid.rounded(value)) for string, value in sorted(total.items()))
    return [[_listed(string), value] for string, value in rounded if value]


def _normalised(strings: dict[String, complex]) -> tuple[float, tuple[Entry, ...]]:
    """Squared size of the leading coefficient, and the operator divided by that coefficient."""
    largest = max(abs(value) for value in strings.values())
    # Coefficients of equal size differ by rounding errors: the first of them leads.
    leader = min(string for string, value in strings.items() if abs(value) > (1 - 1e-9) * largest)
    size = abs(strings[leader])
    phase = strings[leader].conjugate() / size
    grid = _Grid(1.0)
    entries = []
    for string, value in sorted(strings.items()):
        turned = value * phase / size
        real, imaginary = grid.rounded(turned.real), grid.rounded(turned.imag)
        if real or imaginary:
            entries.append((string, real, imaginary))
    return size**2, tuple(entries)


def _jumps(jumps: Sequence[PlacedJump], dimension: int) -> list[list[Any]]:
    rates: dict[tuple[Entry, ...], float] = {}
    for jump, (_, strings) in zip(jumps, operator_strings(jumps, dimension), strict=True):
        if max(abs(value) for value in strings.values()) < SMALLEST:
            continue
        square, entries = _normalised(strings)
        if any(string for string, _, _ in entries):
            rates[entries] = rates.get(entries, 0.0) + jump.rate * square
    return [
        [_Grid(rate).rounded(rate), [[_listed(string), *parts] for string, *parts in entries]]
        for entries, rate in sorted(rates.items())
        if rate > SMALLEST
    ]


def _listed(string: String) -> list[int]:
    return [number for site, kind in string for number in (site + 1, kind)]


def canonical_document(
    sites: int,
    dimension: int,
    boundary: str,
    operators: Sequence[PlacedOperator],
    jumps: Sequence[PlacedJump],
) -> dict[str, Any]:
    """JSON document that is the same for every way of writing the same model.

    ``hamiltonian`` lists [string, coefficient], ``jumps`` [rate, [[string, real, imaginary], ...]],
    and a string is [site, basis index, site, basis index, ...] with 1-based sites.

    Unitary mixing of different jumps is not undone, nor is a shift of a jump by a constant against
    one of H. Jumps proportional to the identity have no effect and are dropped, as is the constant
    of H. Open and periodic chains with the same terms remain different models, since symmetries and
    bonds are read off the boundary. Two ways of writing that differ by rounding errors of 1e-16
    agree unless a coefficient lies that close to an edge of the rounding; the edges are placed away
    from short decimals and binary fractions.
    """
    return {
        "sites": sites,
        "local_dimension": dimension,
        "boundary": boundary,
        "hamiltonian": _hamiltonian(operators, dimension),
        "jumps": _jumps(jumps, dimension),
    }
