"""What counting returns."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from lbwork.model import Model

__all__ = ["CountingStatistics", "GrowthRates"]


@dataclass(frozen=True, eq=False)
class GrowthRates:
    """Scaled cumulant generating function ``theta(chi)``: leading level of the tilted generator.

    ``fields`` and ``values`` float64 (n,); ``residuals`` (n,): ``||L_chi v - theta v|| / ||L||``;
    ``smallest``: smallest eigenvalue of the leading operators at trace 1; a positive one belongs to
    the leading level and to no other (Perron and Frobenius).
    """

    fields: np.ndarray
    values: np.ndarray
    residuals: np.ndarray
    smallest: np.ndarray

    def to_dict(self) -> dict[str, Any]:
        """A JSON document of all arrays."""
        return {
            "fields": [float(value) for value in self.fields],
            "values": [float(value) for value in self.values],
            "residuals": [float(value) for value in self.residuals],
            "smallest": [float(value) for value in self.smallest],
        }


@dataclass(frozen=True, eq=False)
class CountingStatistics:
    """Long-time statistics of a counted current, per time.

    cumulants (4,): mean, variance, third and fourth cumulant rates. residuals (3,): relative
    residuals of the linear equations behind the second to fourth. steady_current: the same mean
    from the local currents of the steady state, None where it has no such current;
    mean_difference: how far the two are apart. steady_residual: ``||L rho|| / ||rho||``.
    """

    model: Model
    counted: str
    cumulants: np.ndarray
    residuals: np.ndarray
    steady_residual: float
    steady_current: float | None
    mean_difference: float | None
    growth: GrowthRates | None
    applies: int

    @property
    def fano_factor(self) -> float:
        """Variance over mean, NaN for a vanishing mean."""
        mean, variance = float(self.cumulants[0]), float(self.cumulants[1])
        return variance / abs(mean) if mean else float("nan")

    def to_dict(self) -> dict[str, Any]:
        """A JSON document of all fields."""
        return {
            "counted": self.counted,
            "cumulants": [float(value) for value in self.cumulants],
            "residuals": [float(value) for value in self.residuals],
            "steady_residual": self.steady_residual,
            "steady_current": self.steady_current,
            "mean_difference": self.mean_difference,
            "growth": None if self.growth is None else self.growth.to_dict(),
            "applies": self.applies,
        }

    def __str__(self) -> str:
        names = ("mean", "variance", "third cumulant", "fourth cumulant")
        lines = [f"counting statistics of {self.model}", f"  counted          {self.counted}"]
        lines += [
            f"  {name:<15}  {value:.12g}" for name, value in zip(names, self.cumulants, strict=True)
        ]
        lines.append(f"  residuals        {'  '.join(f'{value:.1e}' for value in self.residuals)}")
        if self.steady_current is not None:
            lines.append(
                f"  steady current   {self.steady_current:.12g} (differs by "
                f"{self.mean_difference:.1e})"
            )
        if self.growth is not None:
            lines.append("  field        growth rate      residual")
            lines += [
                f"  {field:<+11.4g}  {value:<+15.10g}  {residual:.1e}"
                for field, value, residual in zip(
                    self.growth.fields, self.growth.values, self.growth.residuals, strict=True
                )
            ]
        return "\n".join(lines)
