"""An R-matrix from the density alone, as a power series that solves the Sutherland relation.

The density may depend on the spectral parameter, ``Q(u) = sum_k Q_k u^k`` with ``Q_0 = q``. Its
derivative follows from the third charge, ``[Q2, Q3 - dQ2/du] = 0`` with ``Q3 = sum [q_12, q_23]``,
order by order; each order is one least-squares problem with the same matrix. With Q known,

    [R13 R23, Q12(u)] = R13' R23 - R13 R23',   R = R(u, 0) = P (1 + u q + ...),   ' = d/du,

fixes ``R_k`` order by order from ``R_0 = P``, up to a scalar factor, which is chosen so that P R_k
is traceless for k > 0. An order that cannot be solved shows that there is no such R-matrix (for the
shortest derivative density, see :class:`RMatrixFlow`). That the Sutherland relation determines R:
M. de Leeuw, C. Paletta, A. Pribytok, A. Retore, P. Ryan, Phys. Rev. Lett. 125, 031604 (2020), from
memory.
"""

from __future__ import annotations

import html
from dataclasses import dataclass
from functools import lru_cache
from math import comb
from typing import Any

import numpy as np

from lbwork import defaults
from lbwork.errors import CapacityError, UsageError
from lbwork.integrability.commutators import canonical_sum, commutator, shared_fields
from lbwork.integrability.density import LocalDensity, local_density
from lbwork.integrability.least_squares import factored
from lbwork.integrability.r_matrix import RMatrix, ThreeSites, permutation
from lbwork.model import Model

__all__ = ["RMatrixFlow", "r_matrix_flow"]

Series = tuple[np.ndarray, ...]


@dataclass(frozen=True, eq=False)
class RMatrixFlow:
    """R(u, v) near u = v = 0, with ``Q(0)`` the density of norm one, or why there is none.

    ``density_series``, ``series``: Q_k and R_k, complex (n**2, n**2), as far as they exist.
    ``density_residuals``, ``residuals``: what each order leaves over, relative to the norms of the
    terms of its equation (the largest so far, since higher orders may vanish). ``reach``: ``|u|``
    up to which the truncated series are exact to rounding, from their growth. ``yang_baxter``,
    ``unitarity``: relative residuals at parameters within the reach, nan if there is no R-matrix.

    At every order the shortest solution for the derivative is taken. Conserved charges of range two
    leave a choice there; if only another choice works, an R-matrix is missed.
    """

    density: LocalDensity
    density_series: Series
    series: Series
    density_residuals: tuple[float, ...]
    residuals: tuple[float, ...]
    reach: float
    yang_baxter: float
    unitarity: float

    @property
    def found(self) -> bool:
        """Whether all orders were solved and the Yang-Baxter relation holds."""
        return self.yang_baxter < defaults.FLOW_TOLERANCE

    @property
    def form(self) -> str:
        """``difference`` if Q is the same for all u, else ``non-difference``; or ``none``."""
        if not self.found:
            return "none"
        moving = max((float(np.abs(part).max()) for part in self.density_series[1:]), default=0.0)
        return "difference" if moving < defaults.FLOW_TOLERANCE else "non-difference"

    @property
    def sentence(self) -> str:
        """The outcome in one sentence."""
        if self.found:
            return (
                f"an R-matrix of {self.form} form: Yang-Baxter residual {self.yang_baxter:.1e}, "
                f"unitarity {self.unitarity:.1e}"
            )
        for what, values in (
            ("the derivative of the density", self.density_residuals),
            ("the Sutherland relation", self.residuals),
        ):
            for order, value in enumerate(values, start=1):
                if value > defaults.FLOW_TOLERANCE:
                    return f"no R-matrix: {what} has no solution at order {order}, left {value:.1e}"
        return f"no R-matrix: the Yang-Baxter relation fails by {self.yang_baxter:.1e}"

    def r_matrix(self) -> RMatrix:
        """R(u, v) as a function, for ``|u|`` and ``|v|`` up to half the reach."""
        if not self.found:
            raise UsageError(f"{self.sentence}; there is nothing to evaluate")

        @lru_cache(maxsize=64)
        def based(v: complex) -> Series:
            return _based(self.density, self.density_series, v)

        def function(u: complex, v: complex) -> np.ndarray:
            return _value(based(v), u - v)

        return RMatrix(function, self.density.dimension, f"flow of {self.density.name}")

    def to_dict(self) -> dict[str, Any]:
        """A JSON document without the series."""
        return {
            "density": str(self.density),
            "found": self.found,
            "form": self.form,
            "orders": len(self.series) - 1,
            "density_residuals": list(self.density_residuals),
            "residuals": list(self.residuals),
            "reach": self.reach,
            "yang_baxter": self.yang_baxter if self.found else None,
            "unitarity": self.unitarity if self.found else None,
            "sentence": self.sentence,
        }

    def __str__(self) -> str:
        return f"R-matrix from the {self.density}: {self.sentence}"

    def _repr_html_(self) -> str:
        return f"<p>{html.escape(str(self))}</p>"


def r_matrix_flow(
    source: Model | LocalDensity | np.ndarray,
    *,
    orders: int = defaults.FLOW_ORDERS,
    doubled: bool | None = None,
) -> RMatrixFlow:
    """Integrate the Sutherland relation from ``R(u, u) = P`` and check what comes out.

    Arguments and errors as in :func:`lbwork.integrability.density.local_density`; ``orders`` >= 4
    of the power series; CapacityError above ``FLOW_DIMENSION`` states per site; UsageError for a
    density without content.
    """
    density = local_density(source, doubled=doubled)
    if isinstance(orders, bool) or not isinstance(orders, int) or orders < 4:
        raise UsageError(f"orders = {orders!r} is no whole number >= 4; give such a number")
    if density.dimension > defaults.FLOW_DIMENSION:
        raise CapacityError(
            f"the {density} is too large, at most {defaults.FLOW_DIMENSION} states per site are "
            "treated; use reshetikhin_residual"
        )
    if density.scale == 0:
        raise UsageError(f"the {density} has nothing but telescoping parts; there is no flow")
    densities, left = _density_series(density, orders)
    nothing = float("nan")
    if max(left) > defaults.FLOW_TOLERANCE:
        return RMatrixFlow(density, densities, (), left, (), 0.0, nothing, nothing)
    series, rest = _r_series(density, densities)
    if max(rest) > defaults.FLOW_TOLERANCE:
        return RMatrixFlow(density, densities, series, left, rest, 0.0, nothing, nothing)
    reach = min(_reach(densities), _reach(series))
    yang_baxter, unitarity = _relations(density, densities, series, reach)
    return RMatrixFlow(density, densities, series, left, rest, reach, yang_baxter, unitarity)


def _density_series(density: LocalDensity, orders: int) -> tuple[Series, tuple[float, ...]]:
    """Q_0 .. Q_orders from ``[Q2, Q3 - Q2'] = 0``; stops at the first order without solution."""
    basis, sites = density.basis, ThreeSites(density.dimension)
    pairs = np.arange(basis.size, basis.size**2)
    rows, matrix = commutator(density.table, pairs, 2)
    factors = factored(matrix)
    first, last = [sites.first(density.gauge_fixed)], [sites.last(density.gauge_fixed)]
    found, residuals = [density.gauge_fixed], []
    inner: list[np.ndarray] = []
    derivatives: list[tuple[np.ndarray, np.ndarray]] = []
    largest = 0.0
    root = density.dimension**1.5
    for order in range(orders):
        parts = [_bracket(first[j], last[order - j]) for j in range(order + 1)]
        inner.append(sum(parts[1:], parts[0]))
        terms = [_bracket(first[j] + last[j], inner[order - j]) for j in range(order + 1)]
        for j in range(1, order + 1):
            near, far = derivatives[order - j]
            terms += [-_bracket(first[j], far), -_bracket(last[j], near), -_bracket(first[j], near)]
        largest = max(largest, sum(float(np.linalg.norm(term)) for term in terms) / root)
        codes, values = canonical_sum(basis.coefficients(sum(terms[1:], terms[0])), basis.size)
        known = np.isin(codes, rows)
        target = np.zeros((rows.size, 1), dtype=complex)
        target[np.searchsorted(rows, codes[known]), 0] = values[known]
        solution, rest = factors.solve(target)
        missed = float(np.hypot(np.linalg.norm(rest), np.linalg.norm(values[~known])))
        residuals.append(missed / largest if largest else 0.0)
        if residuals[-1] > defaults.FLOW_TOLERANCE:
            break
        derivative = basis.matrix(shared_fields(solution[:, 0], basis.size))
        derivatives.append((sites.first(derivative), sites.last(derivative)))
        found.append(derivative / (order + 1))
        first.append(sites.first(found[-1]))
        last.append(sites.last(found[-1]))
    return tuple(found), tuple(residuals)


def _bracket(left: np.ndarray, right: np.ndarray) -> np.ndarray:
    return np.asarray(left @ right - right @ left)


def _r_series(
    density: LocalDensity, densities: Series, *, strict: bool = True
) -> tuple[Series, tuple[float, ...]]:
    """R_0 .. and the part of each order that cannot be taken up; ``strict`` stops where it matters.

    At order k, ``R_k13 P23 - P13 R_k23 = Y``. With ``R_k = P W``, ``W_13 - W_32 = P13 Y P23`` is
    read off in strings; W is fixed up to multiples of the identity.
    """
    basis, sites = density.basis, ThreeSites(density.dimension)
    swap = permutation(density.dimension)
    q12 = [sites.first(part) for part in densities]
    outer, last = [sites.outer(swap)], [sites.last(swap)]
    found, residuals, products = [swap.astype(complex)], [], []
    largest = 0.0
    for order in range(len(densities) - 1):
        products.append(sum(outer[j] @ last[order - j] for j in range(order + 1)))
        terms = [_bracket(products[order - j], q12[j]) for j in range(order + 1)]
        terms += [
            -(j + 1) * (outer[j + 1] @ last[order - j] - outer[order - j] @ last[j + 1])
            for j in range(order)
        ]
        largest = max(largest, sum(float(np.linalg.norm(term)) for term in terms))
        target = outer[0] @ sum(terms[1:], terms[0]) @ last[0] / (order + 1)
        strings = basis.coefficients(target)
        part = _split_difference(strings)
        strings[:, 0, :] -= part
        strings[0, :, :] += part.T
        missed = float(np.linalg.norm(strings)) * density.dimension**1.5
        residuals.append(missed * (order + 1) / largest if largest else 0.0)
        if strict and residuals[-1] > defaults.FLOW_TOLERANCE:
            break
        found.append(swap @ basis.matrix(part))
        outer.append(sites.outer(found[-1]))
        last.append(sites.last(found[-1]))
    return tuple(found), tuple(residuals)


def _split_difference(strings: np.ndarray) -> np.ndarray:
    """W (n**2, n**2) with ``W_13 - W_32`` closest to a tensor, first index of W_32 at 3."""
    part = np.zeros(strings.shape[:2], dtype=complex)
    part[1:, 1:] = 0.5 * (strings[1:, 0, 1:] - strings[0, 1:, 1:].T)
    # One-site parts x at the first, y at the second index: x at site 1, y - x at 3, -y at 2.
    at_1, at_2, at_3 = strings[1:, 0, 0], strings[0, 1:, 0], strings[0, 0, 1:]
    part[1:, 0] = (2 * at_1 - at_2 - at_3) / 3
    part[0, 1:] = (at_1 - 2 * at_2 + at_3) / 3
    return part


def _shifted(series: Series, step: complex) -> Series:
    """Taylor coefficients around another point."""
    count = len(series)
    return tuple(
        np.asarray(sum(comb(j, k) * step ** (j - k) * series[j] for j in range(k, count)))
        for k in range(count)
    )


def _based(density: LocalDensity, densities: Series, start: complex) -> Series:
    """Series of R(start + t, start) in t.

    A truncated series says little about the high orders around another point. They do not solve
    their equations, but matter as little for small t as the orders that were left out.
    """
    return _r_series(density, _shifted(densities, start), strict=False)[0]


def _value(series: Series, step: complex) -> np.ndarray:
    total = np.zeros_like(series[0])
    for part in reversed(series):
        total = total * step + part
    return total


def _reach(series: Series) -> float:
    """Where the first term left out is a rounding error, from the growth of the last ones."""
    count = len(series) - 1
    norm = float(np.linalg.norm(series[0]))
    growth = max(
        (float(np.linalg.norm(series[k])) / norm) ** (1 / k)
        for k in range(max(count // 2, 1), count + 1)
    )
    return min(0.5, 10 ** (-15 / (count + 1)) / growth) if growth else 0.5


def _relations(
    density: LocalDensity, densities: Series, series: Series, reach: float
) -> tuple[float, float]:
    """Yang-Baxter at (v + t, v, 0) and unitarity at (v, 0), with v + t the reach."""
    sites, swap = ThreeSites(density.dimension), permutation(density.dimension)
    near = reach * 0.45
    based = _based(density, densities, near)
    r12 = sites.first(_value(based, reach - near))
    r13, r23 = sites.outer(_value(series, reach)), sites.last(_value(series, near))
    left, right = r12 @ r13 @ r23, r23 @ r13 @ r12
    yang_baxter = float(np.linalg.norm(left - right) / np.linalg.norm(left))
    product = _value(series, near) @ swap @ _value(based, -near) @ swap
    trace = np.trace(product) / product.shape[0]
    unitarity = float(np.linalg.norm(product - trace * np.eye(product.shape[0])))
    return yang_baxter, unitarity / float(np.linalg.norm(product))
