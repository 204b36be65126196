"""Symmetry-adapted bases of the doubled chain through QuSpin's ``user_basis``.

One site of the doubled chain has ``d**2`` states. Charges enter as a state filter, the commuting
monomial operations as maps; both are compiled once, for every model, as C callbacks that read
their tables from the argument array.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from lbwork.errors import CapacityError
from lbwork.symmetry.characters import GroupGenerator
from lbwork.symmetry.charges import Charge, ChargeLabel
from lbwork.symmetry.monomials import MonomialMap

__all__ = ["build_basis", "digits_of", "numbers_of", "require_numberable"]


def require_numberable(sites: int, base: int) -> None:
    """Raise CapacityError when basis states do not fit into 64-bit integers."""
    if sites * np.log2(base) >= 62:
        raise CapacityError(
            f"{sites} sites have more operators than 64-bit numbers can count; sectors need at "
            f"most {int(61 / np.log2(base))} sites of this local dimension"
        )


def digits_of(states: np.ndarray, sites: int, base: int) -> np.ndarray:
    """Digits of basis states, site 1 most significant: (n,) -> int64 (n, L)."""
    digits = np.empty((states.size, sites), dtype=np.int64)
    rest = states.astype(np.uint64)
    for site in range(sites - 1, -1, -1):
        rest, digit = np.divmod(rest, np.uint64(base))
        digits[:, site] = digit
    return digits


def numbers_of(digits: np.ndarray, base: int) -> np.ndarray:
    """Inverse of :func:`digits_of`: int (n, L) -> uint64 (n,)."""
    numbers = np.zeros(digits.shape[0], dtype=np.uint64)
    for site in range(digits.shape[1]):
        numbers = numbers * np.uint64(base) + digits[:, site].astype(np.uint64)
    return numbers


def _map_tables(operation: MonomialMap) -> np.ndarray:
    sites, base = operation.digit_map.shape
    weights = np.uint64(base) ** (sites - 1 - operation.site_map).astype(np.uint64)
    return np.concatenate(
        [
            np.array([base], dtype=np.uint64),
            weights.astype(np.uint64),
            operation.digit_map.astype(np.uint64).ravel(),
            (operation.signs < 0).astype(np.uint64).ravel(),
        ]
    )


def _filter_tables(charges: Sequence[Charge], label: ChargeLabel, base: int) -> np.ndarray:
    head = [base, len(charges)]
    bodies = []
    for charge, wanted in zip(charges, label, strict=True):
        lowest = charge.values.min(axis=1, keepdims=True)
        target = wanted - int(lowest.sum())
        head += [charge.modulus, target % charge.modulus if charge.modulus else target]
        bodies.append((charge.values - lowest).astype(np.uint64).ravel())
    return np.concatenate([np.array(head, dtype=np.uint64), *bodies])


def build_basis(
    charges: Sequence[Charge],
    label: ChargeLabel,
    generators: Sequence[GroupGenerator],
    irrep: Sequence[int],
    sites: int,
    base: int,
    expected: int,
) -> Any:
    """QuSpin basis of one sector.

    ``irrep`` holds one integer per generator: the eigenvalue is ``exp(2 pi i irrep / order)``.
    ``expected`` is the dimension known from characters, used to size the arrays.
    """
    # Loading QuSpin and compiling its callbacks takes seconds that matrix-free work does not need.
    from lbwork.symmetry.basis_callbacks import (
        apply_monomial,
        has_charges,
        number_operator,
        user_basis,
    )

    blocks = {
        f"map_{index}": (
            apply_monomial,
            generator.order,
            int(value),
            _map_tables(generator.operation),
        )
        for index, (generator, value) in enumerate(zip(generators, irrep, strict=True))
    }
    return user_basis(
        np.uint64,
        sites,
        {"op": number_operator, "op_args": np.array([base], dtype=np.uint64)},
        sps=base,
        pre_check_state=(has_charges, _filter_tables(charges, label, base)),
        allowed_ops={"n"},
        Ns_block_est=int(expected * 1.05) + 64,
        block_order=list(blocks) or None,
        **blocks,
    )
