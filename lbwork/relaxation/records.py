"""What a time evolution returns."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from lbwork.model import Model

__all__ = ["DecayRate", "Evolution"]


@dataclass(frozen=True, eq=False)
class Evolution:
    """Times (n,) in units of 1/coupling and what was read off on the way.

    picture: ``states`` or ``operators``. profile (n, L): ``<2 S^z_j>`` (states only). expectations:
    by name, complex (n,). traces (n,): of the state, or its overlap with the maximally mixed state
    for operators. smallest: smallest eigenvalue of the last state (states only). final: the state
    or operator at the last time, complex (D, D). error_bound: of the trace norm of the error of the
    last state, or of the operator norm for operators. distances (n,): Frobenius distance from the
    steady state where one was given.
    """

    model: Model
    picture: str
    times: np.ndarray
    profile: np.ndarray | None
    expectations: Mapping[str, np.ndarray]
    traces: np.ndarray
    hermiticity_error: float
    smallest: float | None
    final: np.ndarray
    error_bound: float
    steps: int
    applies: int
    distances: np.ndarray | None

    def to_dict(self) -> dict[str, Any]:
        """A JSON document without the final operator; complex numbers as [re, im]."""
        return {
            "picture": self.picture,
            "times": [float(time) for time in self.times],
            "profile": (
                None
                if self.profile is None
                else [[float(value) for value in row] for row in self.profile]
            ),
            "expectations": {
                name: [[float(value.real), float(value.imag)] for value in values]
                for name, values in self.expectations.items()
            },
            "traces": [float(value) for value in self.traces],
            "hermiticity_error": self.hermiticity_error,
            "smallest": self.smallest,
            "error_bound": self.error_bound,
            "steps": self.steps,
            "applies": self.applies,
            "distances": (
                None if self.distances is None else [float(value) for value in self.distances]
            ),
        }

    def __str__(self) -> str:
        lines = [f"evolution of {self.picture}, {self.model}"]
        names = list(self.expectations)
        head = "  time    " + ("magnetisation" if self.profile is not None else "")
        lines.append(head + "".join(f"  {name}" for name in names))
        for index, time in enumerate(self.times):
            cells = [f"  {time:<8.4g}"]
            if self.profile is not None:
                cells.append("  ".join(f"{value:+.6f}" for value in self.profile[index]))
            cells += [f"{self.expectations[name][index]:.8g}" for name in names]
            if self.distances is not None:
                cells.append(f"distance {self.distances[index]:.3e}")
            lines.append("  ".join(cells))
        lines.append(
            f"  error bound {self.error_bound:.1e}, {self.steps} steps, {self.applies} applications"
        )
        return "\n".join(lines)


@dataclass(frozen=True)
class DecayRate:
    """Late-time approach to the steady state: ``exp(-rate t)``, oscillating with ``frequency``.

    change: of the rate over the last window; misfit: share of the late distance that one decaying
    mode or pair does not describe; time: how long was waited.
    """

    rate: float
    frequency: float
    change: float
    misfit: float
    time: float

    def to_dict(self) -> dict[str, Any]:
        """A JSON document of all fields."""
        return {
            "rate": self.rate,
            "frequency": self.frequency,
            "change": self.change,
            "misfit": self.misfit,
            "time": self.time,
        }

    def __str__(self) -> str:
        return (
            f"asymptotic decay rate {self.rate:.10g}, frequency {self.frequency:.6g} (last change "
            f"{self.change:.1e}, misfit {self.misfit:.1e}, after time {self.time:.4g})"
        )
