"""Matrix products and projections shared out to threads, with one BLAS thread each.

BLAS threads and the threads of compiled loops wait for each other's idle loops when both are used
in turn (a factor of five at 10 sites, measured); a small pool that calls single-threaded BLAS does
not.
"""

from __future__ import annotations

import os
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from functools import lru_cache

import numba
import numpy as np

__all__ = ["combine", "multiply", "project", "share_out"]

SMALLEST = 100
"""Rows below which a product is not worth a second thread."""


@lru_cache(maxsize=1)
def _pool() -> ThreadPoolExecutor:
    return ThreadPoolExecutor(max(numba.get_num_threads(), os.cpu_count() or 1))


def share_out(task: Callable[[int, int], None], size: int, smallest: int = SMALLEST) -> None:
    """Call ``task(begin, end)`` on pieces of ``range(size)``, one piece a thread."""
    threads = numba.get_num_threads()
    if threads == 1 or size < smallest:
        task(0, size)
        return
    edges = [size * part // threads for part in range(threads + 1)]
    waiting = [_pool().submit(task, edges[part], edges[part + 1]) for part in range(1, threads)]
    task(edges[0], edges[1])
    for item in waiting:
        item.result()


def multiply(left: np.ndarray, right: np.ndarray, out: np.ndarray | None = None) -> np.ndarray:
    """``left @ right``, rows shared out."""
    result = np.empty((left.shape[0], right.shape[1]), right.dtype) if out is None else out

    def rows(begin: int, end: int) -> None:
        np.matmul(left[begin:end], right, out=result[begin:end])

    share_out(rows, left.shape[0])
    return result


def project(basis: np.ndarray, vector: np.ndarray) -> np.ndarray:
    """``basis^* @ vector`` for basis vectors in rows, columns shared out."""
    parts: list[np.ndarray] = []

    def columns(begin: int, end: int) -> None:
        piece = vector[begin:end]
        # Conjugating the short side leaves the basis where it is.
        parts.append((basis[:, begin:end] @ piece.conj()).conj())

    share_out(columns, vector.size, 20_000)
    return np.asarray(sum(parts))


def combine(coefficients: np.ndarray, basis: np.ndarray, vector: np.ndarray, sign: int) -> None:
    """``vector += sign coefficients @ basis`` in place, columns shared out."""
    weights = (sign * coefficients).astype(basis.dtype)

    def columns(begin: int, end: int) -> None:
        vector[begin:end] += weights @ basis[:, begin:end]

    share_out(columns, vector.size, 20_000)
