"""Ket basis states sorted by the on-site charges that the generator conserves."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from lbwork.symmetry import SymmetryReport
from lbwork.symmetry.charges import Charge

__all__ = ["KetGroups", "ket_groups"]


@dataclass(frozen=True, eq=False)
class KetGroups:
    """Groups of kets with equal charges.

    ``order`` (D,): basis states group by group; ``position`` its inverse. ``bounds`` (g + 1,):
    where each group begins and ends in ``order``. ``labels`` (g, k): charges of each group, modulo
    ``moduli`` (0: not cyclic). ``charges``: what they are called. ``strong`` (k,): whether the
    charges of ket and bra are conserved separately.
    """

    order: np.ndarray
    position: np.ndarray
    bounds: np.ndarray
    labels: np.ndarray
    moduli: np.ndarray
    charges: tuple[Charge, ...]
    strong: tuple[bool, ...]

    @property
    def sizes(self) -> np.ndarray:
        """Number of kets in each group, int64 (g,)."""
        return np.diff(self.bounds)

    @property
    def group_of(self) -> np.ndarray:
        """Group of each sorted ket, int64 (D,)."""
        return np.repeat(np.arange(self.sizes.size), self.sizes)

    def reduced(self, labels: np.ndarray) -> np.ndarray:
        """Charges brought into their range: cyclic ones modulo their modulus."""
        cyclic = self.moduli > 0
        result = np.array(labels, dtype=np.int64)
        result[..., cyclic] %= self.moduli[cyclic]
        return result

    def mirrored(self, difference: tuple[int, ...]) -> tuple[int, ...]:
        """The charge difference of the adjoint operators, ``-q``."""
        return tuple(self.reduced(-np.array(difference, dtype=np.int64)).tolist())


def _ket_values(charge: Charge, dimension: int) -> tuple[np.ndarray, bool] | None:
    """``f`` (L, d) of a charge ``f(ket) - f(bra)`` or ``f(ket)`` and whether it is the latter."""
    sites = charge.values.shape[0]
    table = charge.values.reshape(sites, dimension, dimension)
    ket, bra = table[:, :, :1] - table[:, :1, :1], table[:, :1, :] - table[:, :1, :1]
    rest = table - table[:, :1, :1] - ket - bra
    modulus = charge.modulus

    def vanishes(values: np.ndarray) -> bool:
        return not np.any(values % modulus if modulus else values)

    if not vanishes(rest):
        return None
    if vanishes(bra):
        return ket[:, :, 0], True
    if vanishes(ket + bra.transpose(0, 2, 1)):
        return ket[:, :, 0], False
    return None


def ket_groups(report: SymmetryReport) -> KetGroups:
    """Groups of kets from the weak and strong charges of a generator; one group without any.

    Charges are those of the basis that ``report.rotation`` leads to.
    """
    sites, dimension = report.model.sites, report.model.local_dimension
    chosen, columns, strong = [], [], []
    for charge in report.charges:
        found = _ket_values(charge, dimension)
        if found is None:
            continue
        values, is_strong = found
        total = np.zeros(1, dtype=np.int64)
        for site in range(sites):
            total = (total[:, None] + values[site][None, :]).ravel()
        chosen.append(charge)
        strong.append(is_strong)
        columns.append(total % charge.modulus if charge.modulus else total)
    size = dimension**sites
    table = np.array(columns, dtype=np.int64).reshape(len(columns), size).T
    labels, group = np.unique(table, axis=0, return_inverse=True)
    group = group.ravel()
    if not columns:
        labels, group = np.zeros((1, 0), dtype=np.int64), np.zeros(size, dtype=np.int64)
    order = np.argsort(group, kind="stable")
    position = np.empty(size, dtype=np.int64)
    position[order] = np.arange(size)
    return KetGroups(
        order=order,
        position=position,
        bounds=np.concatenate([[0], np.cumsum(np.bincount(group, minlength=len(labels)))]),
        labels=labels,
        moduli=np.array([charge.modulus for charge in chosen], dtype=np.int64),
        charges=tuple(chosen),
        strong=tuple(strong),
    )
