"""The compiled callbacks that QuSpin's user basis asks for; imported when a basis is built."""

from __future__ import annotations

from typing import Any

import numba
from quspin.basis.user import (
    map_sig_64,
    op_sig_64,
    pre_check_state_sig_64,
    user_basis,
)

__all__ = ["apply_monomial", "has_charges", "number_operator", "user_basis"]


@numba.cfunc(map_sig_64)
def apply_monomial(
    state: Any, sites: Any, sign_pointer: Any, tables: Any
) -> Any:  # pragma: no cover
    """Image of a basis state under a monomial operation; the sign is multiplied in."""
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
def has_charges(state: Any, sites: Any, tables: Any) -> Any:  # pragma: no cover
    """Whether a basis state has the charges of the sector."""
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
def number_operator(
    result: Any, name: Any, site: Any, sites: Any, tables: Any
) -> Any:  # pragma: no cover
    """The one operator that a user basis must have; it is never applied."""
    numba.carray(result, 1)[0].matrix_ele *= 1.0
    return 0
