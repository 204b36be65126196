"""Nearest neighbours of every level, and which levels are deep enough to be reference levels."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy.spatial import cKDTree

from lbwork import defaults
from lbwork.levels.cleaning import points

__all__ = ["Neighbourhood", "edge_offset", "neighbourhood", "unreliable"]


@dataclass(frozen=True, eq=False)
class Neighbourhood:
    """The k nearest neighbours of each of n distinct levels of the plane.

    levels: complex128 (n,). index: (n, k), nearest first, the level itself left out.
    distance: float64 (n, k). order: (n,), a spatial order in which near levels stand near.
    """

    levels: npt.NDArray[np.complex128]
    index: npt.NDArray[np.intp]
    distance: npt.NDArray[np.float64]
    order: npt.NDArray[np.intp]

    @property
    def steps(self) -> npt.NDArray[np.complex128]:
        """Vectors from each level to its neighbours, complex128 (n, k)."""
        return self.levels[self.index] - self.levels[:, None]

    @property
    def local_spacing(self) -> npt.NDArray[np.float64]:
        """1 / sqrt(local density), the density being k / (pi distance_k^2); float64 (n,)."""
        return self.distance[:, -1] * np.sqrt(np.pi / self.distance.shape[1])


def neighbourhood(
    levels: npt.NDArray[np.complex128], count: int = defaults.LEVEL_EDGE_NEIGHBOURS
) -> Neighbourhood:
    """Neighbourhoods of distinct `levels` (n,), n > count."""
    tree = cKDTree(points(levels))
    distance, index = tree.query(tree.data, k=count + 1)
    return Neighbourhood(levels, index[:, 1:], distance[:, 1:], np.asarray(tree.indices))


def edge_offset(near: Neighbourhood) -> npt.NDArray[np.float64]:
    """How one-sided the surroundings are: |centroid of the neighbours - level| / reach, (n,).

    Independent of the shape of the spectrum: about 0 inside, 4/(3 pi) = 0.42 on a straight edge,
    near 1 for an outlier.
    """
    return np.abs(np.mean(near.steps, axis=1)) / near.distance[:, -1]


def unreliable(
    near: Neighbourhood, bounds: npt.NDArray[np.float64], share: float
) -> npt.NDArray[np.bool_]:
    """Levels whose own error bound exceeds `share` of their nearest-neighbour distance, (n,)."""
    return bounds > share * near.distance[:, 0]
