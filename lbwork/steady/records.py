"""What a steady-state calculation returns."""

from __future__ import annotations

import html
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from lbwork.errors import UsageError
from lbwork.iterative import SPLITTINGS
from lbwork.model import Model

__all__ = ["METHODS", "SteadyBranch", "SteadyOptions", "SteadyState"]

METHODS = ("auto", "matrix-free", "factorised", "filtered")


@dataclass(frozen=True)
class SteadyOptions:
    """method: ``matrix-free`` (preconditioned Krylov solution, large chains), ``factorised`` (dense
    or sparse factorisation of each sector), ``filtered`` (Krylov search in the exponential of the
    generator) or ``auto`` (by size).

    splitting: of the matrix-free preconditioner, ``energy`` ((s + i ad_H)(s - D)), ``no-jump`` (the
    Sylvester operator of Heff) or ``auto`` (tried on shorter chains). search_all: search every
    sector for zero modes, even those that theory excludes; not with ``matrix-free``.
    Raises UsageError for an unknown method or splitting.
    """

    method: str = "auto"
    search_all: bool = False
    splitting: str = "auto"

    def __post_init__(self) -> None:
        splittings = ("auto", *SPLITTINGS)
        if self.splitting not in splittings:
            raise UsageError(f"splitting '{self.splitting}' is not one of {', '.join(splittings)}")
        if self.search_all and self.method == "matrix-free":
            raise UsageError(
                "search_all needs the sector methods; leave the method 'matrix-free' out"
            )
        if self.method not in METHODS:
            raise UsageError(f"method '{self.method}' is not one of {', '.join(METHODS)}")


@dataclass(frozen=True, eq=False)
class SteadyBranch:
    """One of several steady states: legal density matrix (D, D) with its own residual.

    weight: its share in the long-time limit of the maximally mixed state.
    """

    label: str
    density: npt.NDArray[np.complex128]
    residual: float
    weight: float


@dataclass(frozen=True, eq=False)
class SteadyState:
    """A steady state with its certificate and local observables.

    density: complex128 (D, D), Hermitian, trace 1; with several steady states the long-time limit
    of the maximally mixed state. states: all steady states with orthogonal supports (one if it is
    unique). zero_modes: dimension of the null space of the generator; those beyond ``states`` are
    coherences between them. separation: size of the smallest other mode that was met.
    magnetisation (L,): ``<sigma^z_j>`` for d = 2, else ``<2 S^z_j>``. spin_current: of the same
    quantity per bond, positive to the right, (L-1,) or (L,) on a ring, None with
    ``current_reason`` where it is not conserved. correlations (L, L): connected, of the same
    quantity. residual: ``||L rho||_F / ||rho||_F`` by an independent application of L.
    hermiticity_error: ``||rho - rho^dag|| / ||rho||`` before the state was made Hermitian.
    trace: of ``density``. continuity_error: largest ``|d<m_j>/dt - (j_{j-1} - j_j + sources)|``.
    entropy: von Neumann, natural logarithm. method: how it was solved. applies: preconditioned
    applications of the generator in the solution, probe_applies: those in the search for further
    zero modes (0 for direct methods); splitting: that of the preconditioner, empty for direct ones.
    """

    model: Model
    density: npt.NDArray[np.complex128]
    states: tuple[SteadyBranch, ...]
    zero_modes: int
    zero_mode_method: str
    separation: float
    nearly_degenerate: bool
    magnetisation: npt.NDArray[np.float64]
    spin_current: npt.NDArray[np.float64] | None
    current_reason: str
    correlations: npt.NDArray[np.float64]
    trace: float
    hermiticity_error: float
    min_eigenvalue: float
    residual: float
    purity: float
    entropy: float
    continuity_error: float | None
    certified: bool
    method: str = "factorised"
    splitting: str = ""
    applies: int = 0
    probe_applies: int = 0

    def to_dict(self) -> dict[str, Any]:
        """A JSON document without the density matrix."""
        current = None if self.spin_current is None else [float(x) for x in self.spin_current]
        return {
            "magnetisation": [float(value) for value in self.magnetisation],
            "spin_current": current,
            "current_reason": self.current_reason,
            "correlations": [[float(value) for value in row] for row in self.correlations],
            "trace": self.trace,
            "hermiticity_error": self.hermiticity_error,
            "min_eigenvalue": self.min_eigenvalue,
            "residual": self.residual,
            "zero_modes": self.zero_modes,
            "zero_mode_method": self.zero_mode_method,
            "separation": self.separation if np.isfinite(self.separation) else None,
            "nearly_degenerate": self.nearly_degenerate,
            "states": [
                {"label": state.label, "residual": state.residual, "weight": state.weight}
                for state in self.states
            ],
            "purity": self.purity,
            "entropy": self.entropy,
            "continuity_error": self.continuity_error,
            "certified": self.certified,
            "method": self.method,
            "splitting": self.splitting,
            "applies": self.applies,
            "probe_applies": self.probe_applies,
        }

    def _rows(self) -> list[tuple[str, str]]:
        profile = "  ".join(f"{value:+.6f}" for value in self.magnetisation)
        if self.spin_current is None:
            current = f"none: {self.current_reason}"
        else:
            current = "  ".join(f"{value:+.6f}" for value in self.spin_current)
        rows = [
            ("magnetisation", profile),
            ("spin current", current),
            ("zero modes", f"{self.zero_modes} ({self.zero_mode_method})"),
            ("residual", f"{self.residual:.1e}"),
            ("method", self._method_words()),
            ("smallest eigenvalue", f"{self.min_eigenvalue:.3e}"),
            ("purity", f"{self.purity:.9g}"),
            ("entropy", f"{self.entropy:.9g}"),
        ]
        if len(self.states) > 1:
            rows += [
                (
                    state.label,
                    f"weight {state.weight:.6g} in the limit of the maximally mixed state",
                )
                for state in self.states
            ]
        if self.nearly_degenerate:
            rows.append(("nearly degenerate", f"next mode at {self.separation:.1e}"))
        return rows

    def _method_words(self) -> str:
        if self.method != "matrix-free":
            return self.method
        return (
            f"matrix-free, {self.splitting} splitting, {self.applies} applications and "
            f"{self.probe_applies} in the search for further zero modes"
        )

    def __str__(self) -> str:
        rows = self._rows()
        width = max(len(name) for name, _ in rows)
        lines = [f"steady state of {self.model}"]
        return "\n".join(lines + [f"  {name:<{width}}  {value}" for name, value in rows])

    def _repr_html_(self) -> str:
        body = "".join(
            f"<tr><td>{html.escape(name)}</td><td>{html.escape(value)}</td></tr>"
            for name, value in self._rows()
        )
        title = html.escape(f"steady state of {self.model}")
        return f"<table><caption>{title}</caption>{body}</table>"
