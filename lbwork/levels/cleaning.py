"""From the raw levels of a sector to the distinct levels whose spacings mean something.

Order: merge exact degeneracies, see whether the levels lie on a line, and for real matrices keep
the open upper half plane, since the lower one is its mirror image and adds nothing.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components
from scipy.spatial import cKDTree

from lbwork import defaults
from lbwork.levels.records import LevelOptions, LevelSequence

__all__ = ["CleanLevels", "clean", "is_conjugation_closed", "merge_degenerate", "points"]


@dataclass(frozen=True, eq=False)
class CleanLevels:
    """Distinct levels of one sequence.

    levels: complex128 (n,); on a line: sorted along it, stored as position + 0j.
    bounds: float64 (n,). geometry: "plane" or "line". mirror_axis: the real axis is a mirror of the
    spectrum, levels near it are no reference levels. Counts as in SequenceStatistics.
    """

    levels: npt.NDArray[np.complex128]
    bounds: npt.NDArray[np.float64]
    geometry: str
    mirror_axis: bool
    degenerate_levels: int
    degenerate_share: float
    largest_multiplicity: int
    doubled: bool
    real_levels: int
    mirrored_levels: int


def points(levels: npt.NDArray[np.complex128]) -> npt.NDArray[np.float64]:
    """Levels as points of the plane, float64 (n, 2)."""
    return np.column_stack([levels.real, levels.imag])


def _radius(levels: npt.NDArray[np.complex128]) -> float:
    """Largest distance from the mean level; the scale of all relative tolerances."""
    return float(np.max(np.abs(levels - np.mean(levels)))) if levels.size else 0.0


def merge_degenerate(
    levels: npt.NDArray[np.complex128], tolerance: float
) -> tuple[npt.NDArray[np.complex128], npt.NDArray[np.intp], npt.NDArray[np.intp]]:
    """One representative (the mean) per cluster of levels chained by steps below `tolerance`.

    Returns the representatives (k,), the multiplicity of each (k,) and the cluster of each given
    level (n,). Equal levels are gathered on a grid first, so that thousands of copies of one level
    do not make a quadratic number of pairs.
    """
    if levels.size == 0 or tolerance <= 0:
        distinct, owner, counts = np.unique(levels, return_inverse=True, return_counts=True)
        return distinct, counts, owner
    cells = np.round(points(levels) / tolerance)
    _, first, cell_of = np.unique(cells, axis=0, return_index=True, return_inverse=True)
    cell_of = cell_of.reshape(-1)
    pairs = cKDTree(points(levels[first])).query_pairs(2.0 * tolerance, output_type="ndarray")
    graph = coo_array((np.ones(len(pairs)), (pairs[:, 0], pairs[:, 1])), shape=(len(first),) * 2)
    count, cluster_of_cell = connected_components(graph, directed=False)
    owner = cluster_of_cell[cell_of]
    multiplicity = np.bincount(owner, minlength=count)
    sums = np.bincount(owner, levels.real, count) + 1j * np.bincount(owner, levels.imag, count)
    return (sums / multiplicity).astype(np.complex128), multiplicity, owner


def is_conjugation_closed(levels: npt.NDArray[np.complex128]) -> bool:
    """Whether the mirror image of every level is a level, within a tolerance on the radius."""
    if levels.size == 0:
        return False
    mirrored, _ = cKDTree(points(levels)).query(points(levels.conj()))
    return bool(np.max(mirrored) <= defaults.LEVEL_CONJUGATION_TOLERANCE * _radius(levels))


def _line_coordinate(levels: npt.NDArray[np.complex128]) -> npt.NDArray[np.float64] | None:
    """Position along the line if all levels lie on one parallel to an axis, else None."""
    width = defaults.LEVEL_AXIS_TOLERANCE * max(_radius(levels), np.finfo(float).tiny)
    if np.ptp(levels.imag) <= width:
        return levels.real
    if np.ptp(levels.real) <= width:
        return levels.imag
    return None


def clean(sequence: LevelSequence, options: LevelOptions) -> CleanLevels:
    """Distinct levels of one sequence, on a line or in the plane; see the module for the order.

    A real matrix is recognised by `real_matrix` or by a spectrum closed under conjugation. Its real
    levels and its lower half plane are set aside. Real levels among complex ones are set aside for
    the same reason; a spectrum on a line keeps them. The lower half of an imaginary line is set
    aside when it mirrors the upper one.
    """
    raw = np.asarray(sequence.eigenvalues)
    given = raw.size
    bounds = np.zeros(given) if sequence.error_bounds is None else sequence.error_bounds
    scale = _radius(raw)
    levels, multiplicity, owner = merge_degenerate(raw, options.degeneracy_tolerance * scale)
    cluster_bounds = np.zeros(levels.size)
    np.maximum.at(cluster_bounds, owner, bounds)

    position = _line_coordinate(levels) if levels.size else None
    mirror = sequence.real_matrix or is_conjugation_closed(levels)
    axis = defaults.LEVEL_AXIS_TOLERANCE * scale
    real = np.abs(levels.imag) <= axis
    on_real_axis = bool(np.all(real))
    keep = np.ones(levels.size, dtype=bool)
    if mirror and not on_real_axis:
        keep = levels.imag > axis
    mirrored = int(np.sum(levels.imag < -axis)) if mirror and not on_real_axis else 0
    set_aside = int(np.sum(real)) if mirror and not on_real_axis else 0

    kept, kept_bounds = levels[keep], cluster_bounds[keep]
    if position is not None:
        order = np.argsort(position[keep])
        kept, kept_bounds = (position[keep][order]).astype(complex), kept_bounds[order]
    clustered = multiplicity > 1
    return CleanLevels(
        levels=kept,
        bounds=kept_bounds,
        geometry="plane" if position is None else "line",
        mirror_axis=mirror and position is None,
        degenerate_levels=int(given - levels.size),
        degenerate_share=float(np.sum(multiplicity[clustered]) / given) if given else 0.0,
        largest_multiplicity=int(np.max(multiplicity)) if levels.size else 1,
        doubled=bool(levels.size and np.mean(multiplicity == 2) > 0.99),
        real_levels=set_aside,
        mirrored_levels=mirrored,
    )
