"""Compiled loops over the rows of sector vectors; threads share the rows.

Real kernels serve Hermitian sectors (R = Re X + Im X), the complex one all others. The kernels have
fixed signatures, are compiled at the first call and kept on disk.
"""

from __future__ import annotations

import numba

__all__ = ["add_sandwiches", "apply_complex", "apply_real", "subtract_transposed"]

FAST = {"nsz", "contract", "reassoc"}
"""Sums may be reordered and fused; infinities and NaN keep their meaning."""

ROWS = 4
"""Rows that one task of the thread pool works on."""

TILE = 32
"""Edge of the tiles that a transposition moves through the cache."""


@numba.njit(cache=True, fastmath=FAST)
def _add_lists(row, x, start, length, pointer, source, list_of, bounds, target, origin, value, out):
    for entry in range(pointer[row], pointer[row + 1]):
        begin = start[source[entry]]
        values = x[begin : begin + length[source[entry]]]
        number = list_of[entry]
        for item in range(bounds[number], bounds[number + 1]):
            out[target[item]] += value[item] * values[origin[item]]


@numba.njit(cache=True, fastmath=FAST)
def _add_left(row, ket, x, start, of_ket, pointer, column, value, out):
    """``out += sum_k A[ket, k] x[row of k]``."""
    for entry in range(pointer[ket], pointer[ket + 1]):
        begin = start[of_ket[column[entry]]]
        other = x[begin : begin + out.size]
        factor = value[entry]
        for j in range(out.size):
            out[j] += factor * other[j]


@numba.njit(cache=True, fastmath=FAST)
def _add_right(own, first_bra, pointer, column, value, sign, out):
    """``out[j] += sign sum_k A[j, k] own[k]`` with bras j, k of one group."""
    for j in range(out.size):
        total = 0.0
        for entry in range(pointer[first_bra + j], pointer[first_bra + j + 1]):
            total += value[entry] * own[column[entry] - first_bra]
        out[j] += sign * total


@numba.njit(parallel=True, cache=True, fastmath=FAST)
def apply_real(
    x,
    straight,
    turned,
    ket,
    start,
    length,
    first_bra,
    of_ket,
    real_diagonal,
    real_pointer,
    real_column,
    real_value,
    imag_diagonal,
    imag_pointer,
    imag_column,
    imag_value,
    table,
    pointer,
    source,
    list_of,
    bounds,
    target,
    origin,
    value,
):
    """``straight = Ar R + R Ar^T + table * R + sandwiches``, ``turned = Ai R - R Ai^T``.

    ``A = Ar + i Ai`` acts without jumps; the generator is ``straight - turned^T``.
    """
    count = ket.size
    for task in numba.prange((count + ROWS - 1) // ROWS):
        for row in range(task * ROWS, min((task + 1) * ROWS, count)):
            begin, width, k, bra = start[row], length[row], ket[row], first_bra[row]
            own = x[begin : begin + width]
            out, other = straight[begin : begin + width], turned[begin : begin + width]
            for j in range(width):
                out[j] = (real_diagonal[k] + real_diagonal[bra + j]) * own[j]
                other[j] = (imag_diagonal[k] - imag_diagonal[bra + j]) * own[j]
            if table.size:
                weight = table[begin : begin + width]
                for j in range(width):
                    out[j] += weight[j] * own[j]
            if real_column.size:
                _add_left(row, k, x, start, of_ket, real_pointer, real_column, real_value, out)
                _add_right(own, bra, real_pointer, real_column, real_value, 1.0, out)
            _add_left(row, k, x, start, of_ket, imag_pointer, imag_column, imag_value, other)
            _add_right(own, bra, imag_pointer, imag_column, imag_value, -1.0, other)
            _add_lists(
                row, x, start, length, pointer, source, list_of, bounds, target, origin, value, out
            )


@numba.njit(parallel=True, cache=True, fastmath=FAST)
def apply_complex(
    x,
    out_all,
    ket,
    start,
    length,
    first_bra,
    of_ket,
    diagonal,
    left_pointer,
    left_column,
    left_value,
    right_value,
    table,
    pointer,
    source,
    list_of,
    bounds,
    target,
    origin,
    value,
):
    """``A X + X A^dag + table * X + sandwiches``; ``right_value``: conjugates of A's values."""
    count = ket.size
    for task in numba.prange((count + ROWS - 1) // ROWS):
        for row in range(task * ROWS, min((task + 1) * ROWS, count)):
            begin, width, k, bra = start[row], length[row], ket[row], first_bra[row]
            own, out = x[begin : begin + width], out_all[begin : begin + width]
            for j in range(width):
                out[j] = (diagonal[k] + diagonal[bra + j].conjugate()) * own[j]
            if table.size:
                weight = table[begin : begin + width]
                for j in range(width):
                    out[j] += weight[j] * own[j]
            _add_left(row, k, x, start, of_ket, left_pointer, left_column, left_value, out)
            _add_right(own, bra, left_pointer, left_column, right_value, 1.0, out)
            _add_lists(
                row, x, start, length, pointer, source, list_of, bounds, target, origin, value, out
            )


@numba.njit(parallel=True, cache=True, fastmath=FAST)
def add_sandwiches(
    x, out_all, start, length, pointer, source, list_of, bounds, target, origin, value
):
    """``out += sandwiches(x)``."""
    count = start.size
    for task in numba.prange((count + ROWS - 1) // ROWS):
        for row in range(task * ROWS, min((task + 1) * ROWS, count)):
            begin = start[row]
            out = out_all[begin : begin + length[row]]
            _add_lists(
                row, x, start, length, pointer, source, list_of, bounds, target, origin, value, out
            )


@numba.njit(parallel=True, cache=True)
def subtract_transposed(out, turned, offset, size):
    """``out -= turned^T`` for the square block of edge ``size`` that begins at ``offset``."""
    tiles = (size + TILE - 1) // TILE
    for tile in numba.prange(tiles):
        top, bottom = tile * TILE, min((tile + 1) * TILE, size)
        for left in range(0, size, TILE):
            right = min(left + TILE, size)
            for i in range(top, bottom):
                for j in range(left, right):
                    out[offset + i * size + j] -= turned[offset + j * size + i]


@numba.njit(parallel=True, cache=True, fastmath=FAST)
def divide_real(values, offset, energies, shift):
    """``(s R - w R^T) / (s^2 + w^2)`` in place, ``w_ij = E_i - E_j``: the Hermitian matrix behind R
    divided by ``s + i w``."""
    size = energies.size
    tiles = (size + TILE - 1) // TILE
    for tile in numba.prange(tiles):
        top, bottom = tile * TILE, min((tile + 1) * TILE, size)
        for left in range(tile * TILE, size, TILE):
            right = min(left + TILE, size)
            for i in range(top, bottom):
                for j in range(max(left, i), right):
                    width = energies[i] - energies[j]
                    scale = 1.0 / (shift * shift + width * width)
                    upper = values[offset + i * size + j]
                    lower = values[offset + j * size + i]
                    values[offset + i * size + j] = scale * (shift * upper - width * lower)
                    values[offset + j * size + i] = scale * (shift * lower + width * upper)


@numba.njit(parallel=True, cache=True, fastmath=FAST)
def divide_complex(block, left, right, shift):
    """``X_ij / (s + i (E_i - F_j))`` in place."""
    for i in numba.prange(block.shape[0]):
        for j in range(block.shape[1]):
            block[i, j] /= shift + 1j * (left[i] - right[j])
