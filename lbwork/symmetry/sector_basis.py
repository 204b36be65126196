"""Symmetry-adapted bases of the doubled chain through QuSpin's ``user_basis``.

One site of the doubled chain has ``d**2`` states. Charges enter as a state filter, the commuting
monomial operations as maps; both are compiled once, for every model, as C callbacks that read
their tables from the argument array.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numba
import numpy as np
from quspin.basis.user import (
    map_sig_64,
    op_sig_64,
    pre_check_state_sig_64,
    user_basis,
)

from lbwork.errors import CapacityError
from lbwork.symmetry.characters import GroupGenerator
from lbwork.symmetry.charges import Charge, ChargeLabel
from lbwork.symmetry.monomials import MonomialMap

__all__ = ["build_basis", "digits_of", "numbers_of", "require_numberable"]


@numba.cfunc(map_sig_64)
def _apply_monomial(
    state: Any, sites: Any, sign_pointer: Any, tables: Any
) -> Any:  # pragma: no cover
    base = tables[0]
    image = numba.uint64(0)
    for position in range(sites):
        site = sites - 1 - position
        digit = state % base
        state = state // base
        row = 1 + sites + site * base + digit
        image += tables[row] * tables[1 + site]
        if tables[row + sites * base]:
            sign_pointer[0] *= -1
    return image


@numba.cfunc(pre_check_state_sig_64)
def _has_charges(state: Any, sites: Any, tables: Any) -> Any:  # pragma: no cover
    base = tables[0]
    count = tables[1]
    for charge in range(count):
        modulus = tables[2 + 2 * charge]
        target = tables[3 + 2 * charge]
        offset = 2 + 2 * count + charge * sites * base
        rest = state
        total = numba.uint64(0)
        for position in range(sites):
            site = sites - 1 - position
            total += tables[offset + site * base + rest % base]
            rest = rest // base
        if modulus:
            total = total % modulus
        if total != target:
            return False
    return True


@numba.cfunc(op_sig_64)
def _number_operator(
    result: Any, name: Any, site: Any, sites: Any, tables: Any
) -> Any:  # pragma: no cover
    numba.carray(result, 1)[0].matrix_ele *= 1.0
    return 0


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
    blocks = {
        f"map_{index}": (
            _apply_monomial,
            generator.order,
            int(value),
            _map_tables(generator.operation),
        )
        for index, (generator, value) in enumerate(zip(generators, irrep, strict=True))
    }
    return user_basis(
        np.uint64,
        sites,
        {"op": _number_operator, "op_args": np.array([base], dtype=np.uint64)},
        sps=base,
        pre_check_state=(_has_charges, _filter_tables(charges, label, base)),
        allowed_ops={"n"},
        Ns_block_est=int(expected * 1.05) + 64,
        block_order=list(blocks) or None,
        **blocks,
    )
