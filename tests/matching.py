"""Comparing complex spectra as sets with multiplicity, never by sorting complex numbers."""

from __future__ import annotations

import numpy as np
from scipy.sparse import csr_matrix
from scipy.sparse.csgraph import maximum_bipartite_matching
from scipy.spatial import cKDTree

__all__ = ["assert_same_spectrum"]


def _plane(values: np.ndarray) -> np.ndarray:
    return np.column_stack([values.real, values.imag])


def assert_same_spectrum(
    actual: np.ndarray | list[complex],
    expected: np.ndarray | list[complex],
    tolerance: float = 1e-9,
) -> None:
    """Fail unless levels pair off one to one with every pair closer than ``tolerance`` (absolute).

    The pairing is a maximum matching of the graph that joins levels within the tolerance, so the
    verdict is exact for clusters and degenerate levels too. The message gives the unpaired levels
    with their distance to the nearest level of the other set.
    """
    left = np.asarray(actual, dtype=complex).ravel()
    right = np.asarray(expected, dtype=complex).ravel()
    assert left.size == right.size, f"{left.size} levels, expected {right.size}"
    if left.size == 0:
        return
    assert np.all(np.isfinite(left)), f"{np.sum(~np.isfinite(left))} levels are not finite"
    left_tree, right_tree = cKDTree(_plane(left)), cKDTree(_plane(right))
    near = left_tree.query_ball_tree(right_tree, tolerance)
    lengths = np.array([len(row) for row in near])
    columns = np.concatenate([np.asarray(row, dtype=np.int64) for row in near])
    pointer = np.concatenate([[0], np.cumsum(lengths)])
    graph = csr_matrix((np.ones(columns.size), columns, pointer), shape=(left.size, right.size))
    partner = maximum_bipartite_matching(graph, perm_type="column")
    if np.all(partner >= 0):
        return
    lonely = np.flatnonzero(partner < 0)
    distance = right_tree.query(_plane(left[lonely]))[0]
    missed = np.setdiff1d(np.arange(right.size), partner)
    shown = ", ".join(
        f"{left[index]:.10g} (nearest {gap:.1e})"
        for index, gap in zip(lonely[:5], distance[:5], strict=False)
    )
    absent = ", ".join(f"{level:.10g}" for level in right[missed[:5]])
    raise AssertionError(
        f"{lonely.size} of {left.size} levels have no partner within {tolerance:.1e}: {shown}; "
        f"expected levels without partner: {absent}"
    )
