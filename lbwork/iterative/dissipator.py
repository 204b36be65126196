"""``(s - D)^-1`` of the dissipator D, by its elementwise part and a few terms of Neumann's series.

With ``D = E + T``, E elementwise, ``(s - D)^-1 ~ sum_{m <= k} ((s - E)^-1 T)^m (s - E)^-1``. Two
terms make as good a preconditioner as the exact inverse for boundary drives, bulk loss and gain,
incoherent hopping and dephasing (measured), and need no structure of the jumps.
"""

from __future__ import annotations

import numpy as np

from lbwork.iterative.action import LocalMap
from lbwork.iterative.local_form import LocalForm
from lbwork.iterative.space import SectorSpace

__all__ = ["DissipatorResolvent", "mean_decay"]

TERMS = 2


def mean_decay(form: LocalForm) -> float:
    """Mean diagonal entry of ``sum_k g_k l_k^dag l_k``: the rate scale of the dissipator."""
    return float(form.decay.diagonal().real.mean())


class DissipatorResolvent:
    """``X -> (s - D)^-1 X``, approximately, on vectors of a sector."""

    def __init__(
        self, space: SectorSpace, form: LocalForm, shift: float, precision: type = np.float64
    ) -> None:
        size = form.dimension
        terms = [
            (jump.sites, jump.dissipator().reshape((size ** len(jump.sites),) * 4))
            for jump in form.jumps
        ]
        self._transfer = LocalMap(space, terms, form)
        elements = self._transfer.take_table()
        inverse = np.full(space.size, 1 / shift) if elements is None else 1 / (shift - elements)
        kind = precision if space.hermitian else np.result_type(precision, np.complex64)
        self._inverse = inverse.astype(kind)

    def apply(self, vector: np.ndarray) -> np.ndarray:
        """The image of a vector."""
        first = self._inverse * vector
        total = first
        for _ in range(TERMS):
            moved = self._transfer.apply(total)
            moved *= self._inverse
            moved += first
            total = moved
        return np.asarray(total)
