"""Charges of the infinite chain, checked on short rings and open chains with sparse matrices."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.sparse as sparse

from lbwork import defaults
from lbwork.errors import CapacityError, UsageError
from lbwork.integrability.charge_records import ConservedCharge
from lbwork.integrability.density import LocalDensity

__all__ = ["FiniteCheck", "check_charge", "summed_operator"]


@dataclass(frozen=True)
class FiniteCheck:
    """``residual``: ``||[Q, A]|| / (||Q|| ||A||)``, Frobenius norms; on an open chain without what
    acts on the first or the last ``margin`` sites alone, whose share is ``ends``.
    """

    sites: int
    boundary: str
    margin: int
    residual: float
    ends: float

    @property
    def passed(self) -> bool:
        """Whether the residual is below ``CHARGES_RESIDUAL``."""
        return self.residual < defaults.CHARGES_RESIDUAL

    def to_dict(self) -> dict[str, Any]:
        """A JSON document."""
        return {
            "sites": self.sites,
            "boundary": self.boundary,
            "margin": self.margin,
            "residual": self.residual,
            "ends": self.ends,
            "passed": self.passed,
        }

    def __str__(self) -> str:
        place = "ring" if self.boundary == "periodic" else "open chain"
        outcome = "commutes" if self.passed else "does not commute"
        ends = f", left over at the ends {self.ends:.1e}" if self.boundary == "open" else ""
        return f"{place} of {self.sites} sites: {outcome}, residual {self.residual:.1e}{ends}"


def summed_operator(
    matrix: np.ndarray, dimension: int, sites: int, ring: bool
) -> sparse.csr_matrix:
    """``sum_j a_j`` on a chain, csr (n**sites, n**sites), of a density (n**k, n**k).

    On a ring the density also stands at the last places, where it wraps around.
    """
    length = round(np.log(matrix.shape[0]) / np.log(dimension))
    first = sparse.kron(
        sparse.csr_matrix(matrix), sparse.identity(dimension ** (sites - length)), format="csr"
    )
    shift = np.arange(dimension**sites).reshape((dimension,) * sites)
    shift = np.moveaxis(shift, -1, 0).ravel()
    total = first.copy()
    for _ in range(1, sites if ring else sites - length + 1):
        first = first[shift][:, shift]
        total = total + first
    return total.tocsr()


def _kept_traces(matrix: sparse.csr_matrix, kept: int, traced: int, left: bool) -> np.ndarray:
    """Normalised partial trace over the last (``left``) or first sites: (kept, kept)."""
    entries = matrix.tocoo()
    if left:
        (row, inner), (column, other) = (
            np.divmod(entries.row, traced),
            np.divmod(entries.col, traced),
        )
    else:
        (inner, row), (other, column) = np.divmod(entries.row, kept), np.divmod(entries.col, kept)
    same = inner == other
    result = sparse.coo_matrix((entries.data[same], (row[same], column[same])), shape=(kept, kept))
    return np.asarray(result.toarray() / traced)


def check_charge(
    charge: ConservedCharge, sites: int | None = None, *, boundary: str = "periodic"
) -> FiniteCheck:
    """Commutator of a charge with the summed density on a short chain.

    ``sites``: more than the range of the charge on a ring, at least twice the range on an open
    chain, where the commutator may leave something at the ends; by default the smallest number that
    is also at least 4. UsageError for another number or boundary; CapacityError above
    ``CHARGES_FINITE_DIMENSION`` states.
    """
    density: LocalDensity = charge.density
    if boundary not in ("periodic", "open"):
        raise UsageError(f"boundary = {boundary!r} is not known; use periodic or open")
    needed = charge.length + 1 if boundary == "periodic" else 2 * max(charge.length, 2)
    sites = max(needed, 4) if sites is None else sites
    if sites < needed:
        raise UsageError(
            f"{sites} sites are too few for a charge of range {charge.length} on a chain with "
            f"boundary = {boundary}; use at least {needed}"
        )
    n = density.dimension
    if float(n) ** sites > defaults.CHARGES_FINITE_DIMENSION:
        raise CapacityError(
            f"{sites} sites of {n} states are {float(n) ** sites:.2g} states, at most "
            f"{defaults.CHARGES_FINITE_DIMENSION:.2g} are checked; use fewer sites"
        )
    ring = boundary == "periodic"
    whole = summed_operator(density.gauge_fixed, n, sites, ring)
    operator = summed_operator(charge.matrix(), n, sites, ring)
    commutator = (whole @ operator - operator @ whole).tocsr()
    scale = float(sparse.linalg.norm(whole) * sparse.linalg.norm(operator))
    total = float(sparse.linalg.norm(commutator))
    if ring or total == 0:
        return FiniteCheck(sites, boundary, 0, total / scale, 0.0)
    margin = max(charge.length, 2)
    kept, rest = n**margin, n ** (sites - margin)
    one = sparse.identity(rest)
    left = sparse.kron(_kept_traces(commutator, kept, rest, True), one)
    right = sparse.kron(one, _kept_traces(commutator, kept, rest, False))
    bulk = float(sparse.linalg.norm(commutator - left - right))
    return FiniteCheck(sites, boundary, margin, bulk / scale, total / scale)
