"""How the gap closes with the length of the chain: ``gap ~ a L^-z``."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from lbwork.errors import UsageError

__all__ = ["GapScaling", "gap_scaling"]


@dataclass(frozen=True)
class GapScaling:
    """Power law through gaps at several lengths.

    exponent: z of ``gap = amplitude * L**-exponent``, least squares on logarithms. exponent_error:
    largest change of z when one length is left out, None for two lengths. fit_error: standard error
    of z from the scatter about the line, None for two lengths. local_exponents: z
    between neighbouring lengths; a drift along them is the finite-size correction, which no error
    bar shows.
    """

    sites: tuple[int, ...]
    gaps: tuple[float, ...]
    amplitude: float
    exponent: float
    exponent_error: float | None
    fit_error: float | None
    local_exponents: tuple[float, ...]

    def to_dict(self) -> dict[str, Any]:
        """A JSON document of all fields."""
        return {
            "sites": list(self.sites),
            "gaps": list(self.gaps),
            "amplitude": self.amplitude,
            "exponent": self.exponent,
            "exponent_error": self.exponent_error,
            "fit_error": self.fit_error,
            "local_exponents": list(self.local_exponents),
        }

    def __str__(self) -> str:
        error = ""
        if self.exponent_error is not None:
            error = (
                f" +- {self.fit_error:.2g} (scatter), +- {self.exponent_error:.2g} (leaving a "
                "length out)"
            )
        lines = [f"gap = {self.amplitude:.4g} * L^-z with z = {self.exponent:.4g}{error}"]
        lines += [
            f"  L = {size:<4d} {gap:.12g}" for size, gap in zip(self.sites, self.gaps, strict=True)
        ]
        return "\n".join(lines)


def _line(sizes: np.ndarray, gaps: np.ndarray) -> tuple[float, float]:
    slope, offset = np.polyfit(np.log(sizes), np.log(gaps), 1)
    return -float(slope), float(np.exp(offset))


def gap_scaling(sites: Sequence[int], gaps: Sequence[float]) -> GapScaling:
    """Fit ``gap = a L**-z`` to gaps (> 0) at two or more different lengths.

    Raises UsageError when there are fewer, or a gap is not positive (no power law goes through it).
    """
    if len(sites) != len(gaps) or len(set(sites)) != len(sites) or len(sites) < 2:
        raise UsageError(
            f"{len(gaps)} gaps at lengths {list(sites)}; a fit needs two or more different lengths"
        )
    closed = [size for size, gap in zip(sites, gaps, strict=True) if not gap > 0]
    if closed:
        raise UsageError(f"the gap at length {closed[0]} is not positive; leave this length out")
    order = np.argsort(sites)
    lengths, values = np.array(sites, float)[order], np.array(gaps, float)[order]
    exponent, amplitude = _line(lengths, values)
    error = scatter = None
    if lengths.size > 2:
        offsets = np.log(lengths) - np.log(lengths).mean()
        misfit = np.log(values) - np.log(amplitude) + exponent * np.log(lengths)
        variance = float(np.sum(misfit**2)) / (lengths.size - 2)
        scatter = float(np.sqrt(variance / np.sum(offsets**2)))
        others = [
            _line(np.delete(lengths, index), np.delete(values, index))[0]
            for index in range(lengths.size)
        ]
        error = float(max(abs(other - exponent) for other in others))
    local = -np.diff(np.log(values)) / np.diff(np.log(lengths))
    return GapScaling(
        tuple(int(size) for size in lengths),
        tuple(float(value) for value in values),
        amplitude,
        exponent,
        error,
        scatter,
        tuple(float(value) for value in local),
    )
