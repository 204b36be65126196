"""Reshetikhin-type conditions on a two-site density, in difference and non-difference form.

With ``Q2 = sum_j q_{j,j+1}`` and ``Q3 = sum_j [q_{j,j+1}, q_{j+1,j+2}]`` one has
``[Q2, Q3] = sum_j C_j`` with ``C = [q_12 + q_23, [q_12, q_23]]``. If q comes from an R-matrix that
depends on the difference of its spectral parameters, the sum vanishes: C telescopes,
``C = A_12 - A_23`` (condition of N. Reshetikhin, as in P. Kulish, E. Sklyanin, Lect. Notes Phys.
151, 61 (1982), from memory). If R depends on both parameters, ``Q3 - sum_j d_{j,j+1}`` commutes
with Q2, where d is the derivative of q along the spectral parameter (M. de Leeuw, C. Paletta,
A. Pribytok, A. Retore, P. Ryan, Phys. Rev. Lett. 125, 031604 (2020), from memory); d is solved for.
"""

from __future__ import annotations

import html
from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.sparse as sparse

from lbwork import defaults
from lbwork.integrability.commutators import (
    canonical_sum,
    canonical_weights,
    commutator,
    shared_fields,
)
from lbwork.integrability.density import LocalDensity, local_density
from lbwork.integrability.least_squares import factored
from lbwork.model import Model

__all__ = ["ReshetikhinResult", "reshetikhin_residual"]


@dataclass(frozen=True, eq=False)
class ReshetikhinResult:
    """Residuals relative to ``||C||``, between 0 and 1; see :func:`reshetikhin_residual`.

    ``difference``: distance of C from telescoping operators. ``non_difference``: what is left of
    it when the derivative density is solved for. ``strength``: ``||C|| / ||q||**3``, norms over
    the root of the dimension; 0 when neighbouring densities commute, and then both residuals are 0.
    ``derivative``: the shortest solution d, complex (n**2, n**2), in units of q**2: dq/du along the
    spectral parameter, normalised so that ``q = P dR(u, v)/du`` at ``v = u``.
    ``freedom``: dimension of the solutions for C = 0, the conserved operators of range up to 2.
    """

    density: LocalDensity
    difference: float
    non_difference: float
    strength: float
    leading: float
    derivative: np.ndarray
    freedom: int

    @property
    def form(self) -> str:
        """``difference``, ``non-difference`` or ``none``: which condition is satisfied."""
        if self.difference < defaults.RESHETIKHIN_TOLERANCE:
            return "difference"
        if self.non_difference < defaults.RESHETIKHIN_TOLERANCE:
            return "non-difference"
        return "none"

    @property
    def sentence(self) -> str:
        """The outcome in one sentence, with what it does not prove."""
        if self.strength == 0:
            return "neighbouring densities commute, so that the conditions say nothing"
        if self.leading == 0 and self.form == "none":
            return (
                "the nested commutator has no part on three sites: the conditions cannot tell, "
                "look at the conserved charges"
            )
        if self.leading == 0:
            return "the nested commutator is a conserved charge of range two"
        if self.form == "difference":
            return "a third charge of range three is conserved, as for an R-matrix R(u - v)"
        if self.form == "non-difference":
            return (
                "a third charge of range three is conserved once the density may depend on the "
                "spectral parameter, as for an R-matrix R(u, v)"
            )
        return (
            "no third charge of range three with the nested commutator as its leading part; this "
            "excludes an R-matrix with this density, not other ways to solve the model"
        )

    def to_dict(self) -> dict[str, Any]:
        """A JSON document; the derivative density as pairs [re, im]."""
        return {
            "density": str(self.density),
            "difference": self.difference,
            "non_difference": self.non_difference,
            "strength": self.strength,
            "leading": self.leading,
            "form": self.form,
            "freedom": self.freedom,
            "sentence": self.sentence,
            "derivative": [
                [[float(entry.real), float(entry.imag)] for entry in row] for row in self.derivative
            ],
        }

    def _rows(self) -> list[tuple[str, str]]:
        return [
            ("difference form", f"{self.difference:.2e}"),
            ("non-difference form", f"{self.non_difference:.2e}"),
            ("strength of C", f"{self.strength:.2e}"),
            ("conserved operators of range up to 2", str(self.freedom)),
        ]

    def __str__(self) -> str:
        lines = [f"Reshetikhin-type residuals, {self.density}"]
        lines += [f"  {label:<38}{value}" for label, value in self._rows()]
        return "\n".join([*lines, f"  {self.sentence}"])

    def _repr_html_(self) -> str:
        rows = "".join(
            f"<tr><td>{html.escape(label)}</td><td>{html.escape(value)}</td></tr>"
            for label, value in self._rows()
        )
        caption = html.escape(f"Reshetikhin-type residuals, {self.density}")
        return f"<table><caption>{caption}</caption>{rows}</table>"


def _nested(density: LocalDensity) -> tuple[np.ndarray, np.ndarray]:
    """String tensors (n**2,) * 3 of ``[q_12, q_23]`` and C, of the density of norm one."""
    matrix, one = density.gauge_fixed, np.eye(density.dimension)
    left, right = np.kron(matrix, one), np.kron(one, matrix)
    inner = left @ right - right @ left
    both = left + right
    nested = both @ inner - inner @ both
    return density.basis.coefficients(inner), density.basis.coefficients(nested)


def reshetikhin_residual(
    source: Model | LocalDensity | np.ndarray, *, doubled: bool | None = None
) -> ReshetikhinResult:
    """Residuals of both conditions for a model's generator or any two-site density.

    ``difference = min_A ||C - (A_12 - A_23)|| / ||C||`` and
    ``non_difference = min_{A, d} ||C - [q_12, d_12 + d_23] - [q_23, d_12] - (A_12 - A_23)|| /
    ||C||`` with Frobenius norms on three sites and q without identity and telescoping parts. Both
    are the same for ``c q``, ``q + 1``, ``q + A x 1 - 1 x A``, ``(w x w) q (w x w)^dag`` and the
    mirrored density. Arguments and errors as in
    :func:`lbwork.integrability.density.local_density`; CapacityError when the least-squares problem
    is too large. Sources: see the module.
    """
    density = local_density(source, doubled=doubled)
    size = density.basis.size
    inner, nested = _nested(density)
    norm, leading = float(np.linalg.norm(nested)), float(np.linalg.norm(inner[1:, :, 1:]))
    codes, values = canonical_sum(nested, size)
    pairs = np.arange(size, size**2)
    rows, columns = commutator(density.table, pairs, 2)
    every = np.union1d(rows, codes)
    weights = canonical_weights(every, size, 3)
    target = np.zeros(every.size, dtype=complex)
    target[np.searchsorted(every, codes)] = values
    entries = columns.tocoo()
    place = np.searchsorted(every, rows)[entries.row]
    weighted = sparse.csc_matrix(
        (entries.data * weights[place], (place, entries.col)), shape=(every.size, pairs.size)
    )
    target *= weights
    factors = factored(weighted)
    solution, residual = (part.ravel() for part in factors.solve(target[:, None]))
    commuting = norm < defaults.RESHETIKHIN_COMMUTING
    ranged = leading > defaults.RESHETIKHIN_COMMUTING
    if not ranged:
        solution, residual = np.zeros_like(solution), target
    tensor = shared_fields(solution, size)
    return ReshetikhinResult(
        density=density,
        difference=0.0 if commuting else float(np.linalg.norm(target)) / norm,
        non_difference=0.0 if commuting else float(np.linalg.norm(residual)) / norm,
        strength=0.0 if commuting else norm,
        leading=leading if ranged else 0.0,
        derivative=density.basis.matrix(tensor) * density.scale**2,
        freedom=factors.freedom,
    )
