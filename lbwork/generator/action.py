"""Matrix-free application of a generator to a density matrix, threads over blocks of rows.

``L(rho) = A rho + rho A^dag + sum_k l_k rho l_k^dag`` with sparse ``A`` and ``l_k`` of dimension
``D = d**L`` (rates absorbed). With ``A = diag(a) + x + i y`` and the diagonal jumps in G,

    ``L(rho)_ij = (a_i + a_j* + G_ij) rho_ij + (x rho + rho x^T)_ij + i (y rho - rho y^T)_ij``

plus the off-diagonal jumps, so that every inner loop multiplies contiguous doubles by one real
number: rows of rho from the left, runs within a row that stays in the first-level cache from the
right. Besides input and output only G, one row per block in work and D x D-sparse operators are
held, never a matrix of dimension ``D**2``.

The kernel has one signature for all models; it is compiled at the first call (seconds) and kept on
disk, so that importing costs nothing.
"""

from __future__ import annotations

import numba
import numpy as np

from lbwork.generator.tables import ActionTables

__all__ = ["apply_tables"]

BLOCK = 8
"""Rows that one task of the thread pool works on."""

FAST = {"nsz", "contract", "reassoc"}
"""Sums may be reordered and fused; infinities and NaN keep their meaning."""


@numba.njit(cache=True, fastmath=FAST)
def _add_rows(i, rho, pointer, column, value, total):  # pragma: no cover
    """``total += sum_k value[i, k] rho[k]`` on doubles, four rows at a time."""
    position, last = pointer[i], pointer[i + 1]
    while last - position >= 4:
        a, b = value[position], value[position + 1]
        c, d = value[position + 2], value[position + 3]
        first, second = rho[column[position]], rho[column[position + 1]]
        third, fourth = rho[column[position + 2]], rho[column[position + 3]]
        for j in range(total.size):
            total[j] += a * first[j] + b * second[j] + c * third[j] + d * fourth[j]
        position += 4
    while last - position >= 2:
        a, b = value[position], value[position + 1]
        first, second = rho[column[position]], rho[column[position + 1]]
        for j in range(total.size):
            total[j] += a * first[j] + b * second[j]
        position += 2
    if position < last:
        a, first = value[position], rho[column[position]]
        for j in range(total.size):
            total[j] += a * first[j]


@numba.njit(cache=True, fastmath=FAST)
def _add_piece(total, target, source, origin, length, factor):  # pragma: no cover
    """``total[target + t] += factor source[origin + t]``; offsets and length count doubles."""
    into, of = total[target : target + length], source[origin : origin + length]
    for j in range(into.size):
        into[j] += factor.real * of[j]
    if factor.imag != 0.0:
        for j in range(0, into.size, 2):
            into[j] -= factor.imag * of[j + 1]
            into[j + 1] += factor.imag * of[j]


@numba.njit(cache=True, fastmath=FAST)
def _add_runs(source, places, values, bound, factor, total):  # pragma: no cover
    """``total += factor source M^T`` for one row ``source`` and the runs of M, real or complex."""
    # Unsigned places spare the test for negative indices at every access.
    one = np.uint64(1)
    for run in range(bound[0], bound[1]):
        scale = factor * values[run]
        target, origin = np.uint64(places[run, 0]), np.uint64(places[run, 1])
        re, im = source[origin], source[origin + one]
        total[target] += scale.real * re
        total[target + one] += scale.real * im
        if scale.imag != 0.0:
            total[target] -= scale.imag * im
            total[target + one] += scale.imag * re
    for run in range(bound[1], bound[2]):
        target, origin = np.uint64(places[run, 0]), np.uint64(places[run, 1])
        length = np.uint64(places[run, 2])
        _add_piece(total, target, source, origin, length, factor * values[run])


@numba.njit(cache=True, fastmath=FAST)
def _add_jumps(
    i, rho, pointer, column, value, places, values, bounds, spare, total
):  # pragma: no cover
    """``total += sum_k (l_k rho l_k^dag)[i]`` over the off-diagonal jumps; ``spare`` is a row."""
    dimension = rho.shape[0]
    zero, whole = np.uint64(0), np.uint64(rho.shape[1])
    for k in range(bounds.shape[0]):
        first, last = pointer[k * dimension + i], pointer[k * dimension + i + 1]
        if last - first == 1:
            _add_runs(rho[column[first]], places, values, bounds[k], value[first], total)
        elif last > first:
            spare[:] = 0.0
            for position in range(first, last):
                _add_piece(spare, zero, rho[column[position]], zero, whole, value[position])
            _add_runs(spare, places, values, bounds[k], 1.0, total)


@numba.njit(cache=True, fastmath=FAST)
def _weigh(row, diagonal, own, factor_real, factor_imaginary, turned, total):  # pragma: no cover
    """``total = (a_i + a_j* + G_ij) row_j + i turned_j`` with ``own = a_i``."""
    for j in range(diagonal.size):
        re = own.real + diagonal[j].real
        im = own.imag - diagonal[j].imag
        total[2 * j] = re * row[2 * j] - im * row[2 * j + 1] - turned[2 * j + 1]
        total[2 * j + 1] = re * row[2 * j + 1] + im * row[2 * j] + turned[2 * j]
    for j in range(factor_real.size):
        total[2 * j] += factor_real[j] * row[2 * j]
        total[2 * j + 1] += factor_real[j] * row[2 * j + 1]
    for j in range(factor_imaginary.size):
        total[2 * j] -= factor_imaginary[j] * row[2 * j + 1]
        total[2 * j + 1] += factor_imaginary[j] * row[2 * j]


@numba.njit(parallel=True, cache=True, fastmath=FAST)
def _apply(
    rho,
    out,
    diagonal,
    x_ptr,
    x_col,
    x_val,
    y_ptr,
    y_col,
    y_val,
    j_ptr,
    j_col,
    j_val,
    p_places,
    p_values,
    p_bounds,
    j_places,
    j_values,
    j_bounds,
    g_real,
    g_imag,
):  # pragma: no cover
    """The kernel on doubles: ``rho`` and ``out`` are float64 (D, 2 D) views."""
    dimension = rho.shape[0]
    for block in numba.prange((dimension + BLOCK - 1) // BLOCK):
        spare = np.empty(2 * dimension)
        for i in range(block * BLOCK, min((block + 1) * BLOCK, dimension)):
            row, total = rho[i], out[i]
            spare[:] = 0.0
            _add_rows(i, rho, y_ptr, y_col, y_val, spare)
            _add_runs(row, p_places, p_values, p_bounds[1], -1.0, spare)
            _weigh(row, diagonal, diagonal[i], g_real[i], g_imag[i], spare, total)
            _add_rows(i, rho, x_ptr, x_col, x_val, total)
            _add_runs(row, p_places, p_values, p_bounds[0], 1.0, total)
            _add_jumps(i, rho, j_ptr, j_col, j_val, j_places, j_values, j_bounds, spare, total)


def apply_tables(
    tables: ActionTables, rho: np.ndarray, out: np.ndarray | None = None
) -> np.ndarray:
    """``A rho + rho A^dag + sum l rho l^dag``; ``rho`` and the result are complex128 (D, D).

    ``rho`` may be any numeric array and is copied when it is not C-contiguous complex128; ``out``
    must be that already, of the same shape, and share no memory with ``rho``: the kernel does not
    check.
    """
    rho = np.ascontiguousarray(rho, dtype=np.complex128)
    if out is None:
        out = np.empty_like(rho)
    _apply(rho.view(np.float64), out.view(np.float64), *tables.arrays())
    return out
