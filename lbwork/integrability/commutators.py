"""Commutators of translation-summed operators with ``sum_j q_{j,j+1}`` on the infinite chain.

An operator ``A = sum_j a_j`` is given by a density a whose strings begin with a traceless operator:
strings that differ by a shift are the same operator, so this *canonical* form has no freedom left,
and ``A = 0`` exactly when all canonical coefficients vanish. A string of up to w sites has the code
of its digits filled up with identities on the right.
"""

from __future__ import annotations

import numpy as np
import scipy.sparse as sparse

from lbwork import defaults
from lbwork.errors import CapacityError
from lbwork.integrability.strings import CommutatorTable

__all__ = [
    "canonical_codes",
    "canonical_sum",
    "canonical_weights",
    "commutator",
    "digits_of",
    "shared_fields",
    "string_ranges",
]


def digits_of(codes: np.ndarray, base: int, width: int) -> np.ndarray:
    """Digits (N, width) of codes, first site first."""
    powers = base ** np.arange(width - 1, -1, -1, dtype=np.int64)
    return np.asarray((codes[:, None] // powers) % base)


def string_ranges(codes: np.ndarray, base: int, width: int) -> np.ndarray:
    """Sites from the first to the last operator that is not the identity, int64 (N,)."""
    ranges = np.full(codes.shape, width, dtype=np.int64)
    for shorter in range(1, width + 1):
        ranges -= codes % base**shorter == 0
    return ranges


def canonical_codes(codes: np.ndarray, base: int, width: int) -> np.ndarray:
    """Codes shifted left until the first site is not the identity; the identity stays 0."""
    shifted = codes.copy()
    for _ in range(width - 1):
        late = (shifted < base ** (width - 1)) & (shifted > 0)
        if not late.any():
            break
        shifted[late] *= base
    return shifted


def canonical_sum(tensor: np.ndarray, base: int) -> tuple[np.ndarray, np.ndarray]:
    """Canonical codes over three sites, sorted, and coefficients of ``sum_j`` of a tensor."""
    flat = tensor.ravel()
    present = np.flatnonzero(np.abs(flat) > 1e-16)
    present = present[present > 0]
    codes, inverse = np.unique(canonical_codes(present, base, 3), return_inverse=True)
    values = np.zeros(codes.size, dtype=complex)
    np.add.at(values, inverse, flat[present])
    return codes, values


def shared_fields(canonical: np.ndarray, base: int) -> np.ndarray:
    """Tensor (base, base) from the coefficients of the codes base .. base**2 - 1.

    One-site strings stand for a field, which is shared equally between both sites.
    """
    tensor = np.zeros((base, base), dtype=complex)
    tensor[1:] = canonical.reshape(base - 1, base)
    tensor[1:, 0] *= 0.5
    tensor[0, 1:] = tensor[1:, 0]
    return tensor


def canonical_weights(codes: np.ndarray, base: int, width: int) -> np.ndarray:
    """``1/sqrt(width - range + 1)``: turns canonical coefficients into a distance.

    A string of range r fits in a window of ``width`` sites at ``width - r + 1`` places; the
    operators on the window that sum to zero over the chain are those whose coefficients over these
    places add up to zero, and the distance from them is the sum over the root of their number.
    """
    return np.asarray(1 / np.sqrt(width - string_ranges(codes, base, width) + 1.0))


def _expand(
    table: CommutatorTable, windows: np.ndarray, places: range, width: int
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Codes, columns and values of ``[q_{i,i+1}, string]`` over the bonds i of the windows."""
    base = table.base
    pointer, rows, values = table.matrix.indptr, table.matrix.indices, table.matrix.data
    found: list[tuple[np.ndarray, np.ndarray, np.ndarray]] = []
    for place in places:
        unit = base ** (width - 2 - place)
        pair = (windows // unit) % base**2
        count = pointer[pair + 1] - pointer[pair]
        column = np.repeat(np.arange(windows.size), count)
        offset = np.arange(column.size) - np.repeat(np.cumsum(count) - count, count)
        entry = np.repeat(pointer[pair], count) + offset
        rest = windows - pair * unit
        found.append((np.repeat(rest, count) + rows[entry] * unit, column, values[entry]))
    codes, columns, entries = zip(*found, strict=True)
    return np.concatenate(codes), np.concatenate(columns), np.concatenate(entries)


def commutator(
    table: CommutatorTable, codes: np.ndarray, width: int
) -> tuple[np.ndarray, sparse.csc_matrix]:
    """Canonical form of ``[sum_j q_j, sum_j s_j]`` for strings s of up to ``width`` sites.

    ``codes``: canonical, over ``width`` sites. Returns the sorted canonical codes over
    ``width + 1`` sites that occur and a csc matrix (codes, strings). CapacityError when the codes
    exceed 64 bits or the entries the memory set aside for them.
    """
    base = table.base
    if base ** (width + 2) >= 2**62:
        raise CapacityError(
            f"strings of {width} sites with {base} operators per site exceed 62 bits; ask for "
            "shorter charges"
        )
    # Window: one identity before and one after the string, bonds 0..width.
    windows = codes * base
    counts = np.diff(table.matrix.indptr)
    needed = sum(
        int(counts[(windows // base ** (width - place)) % base**2].sum())
        for place in range(width + 1)
    )
    if needed > defaults.CHARGES_ENTRIES:
        raise CapacityError(
            f"commutators of {codes.size} strings of up to {width} sites have {needed:.2g} "
            f"entries, at most {defaults.CHARGES_ENTRIES:.2g} are treated; ask for shorter charges"
        )
    found, columns, values = _expand(table, windows, range(width + 1), width + 2)
    found = canonical_codes(found, base, width + 2)
    # The identity cannot come out of a commutator but for rounding; the last site is free again
    # once strings are shifted to the left.
    kept = found > 0
    rows, inverse = np.unique(found[kept] // base, return_inverse=True)
    matrix = sparse.coo_matrix(
        (values[kept], (inverse, columns[kept])), shape=(rows.size, codes.size)
    ).tocsc()
    matrix.data[np.abs(matrix.data) < 1e-14] = 0
    matrix.eliminate_zeros()
    return rows, matrix
