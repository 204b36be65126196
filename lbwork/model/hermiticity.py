"""The check that the Hamiltonian is Hermitian, term by term or in total."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from lbwork.errors import ModelError
from lbwork.model.places import PlacedOperator
from lbwork.model.strings import total_strings

__all__ = ["check_hermitian"]

TOLERANCE = 1e-12
"""Largest anti-Hermitian part of a legal Hamiltonian, relative to its largest coefficient."""


def check_hermitian(terms: Sequence[tuple[int, PlacedOperator]], dimension: int) -> None:
    """Raises ModelError when the sum of the terms (number of the term, operator) is not Hermitian.

    Terms that are not Hermitian themselves may make up for each other, as S+ S- and S- S+ do.
    """
    known: dict[int, bool] = {}
    for _, placed in terms:
        key = id(placed.matrix)
        if key not in known:
            known[key] = _is_hermitian(placed.matrix)
    if all(known.values()):
        return
    total = total_strings([placed for _, placed in terms], dimension)
    worst = max(total, key=lambda string: abs(total[string].imag))
    defect = abs(total[worst].imag) / max(abs(value) for value in total.values())
    if defect <= TOLERANCE:
        return
    sites = [site for site, _ in worst]
    guilty = sorted(
        {
            number
            for number, placed in terms
            if not known[id(placed.matrix)] and set(sites) <= set(placed.sites)
        }
    )
    numbers = ", ".join(str(number) for number in guilty)
    where = ", ".join(str(site + 1) for site in sites)
    part = f"on site(s) {where}" if sites else "in its constant part"
    raise ModelError(
        f"hamiltonian term {numbers}: not Hermitian {part} (relative defect {defect:.1e}), and no "
        "other term makes up for it; add the Hermitian conjugate"
    )


def _is_hermitian(matrix: np.ndarray) -> bool:
    defect = np.abs(matrix - matrix.conj().T).max()
    return bool(defect <= TOLERANCE * np.abs(matrix).max())
