"""Nearest-neighbour spacings in units of the local mean spacing."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from lbwork.levels.neighbours import Neighbourhood

__all__ = ["line_spacings", "plane_spacings"]


def plane_spacings(near: Neighbourhood, neighbours: int | None = None) -> npt.NDArray[np.float64]:
    """s = d_1 sqrt(density) with the density K / (pi d_K^2) of the K = `neighbours` nearest, (n,).

    d_q is the distance of the q-th neighbour; all k of the neighbourhood by default. The mean is
    not set to 1 here. For independent points s^2 is K/pi times a beta variable with parameters
    (1, K - 1), so that the variance over the squared mean tends to 4/pi - 1 as K grows.
    """
    count = near.distance.shape[1] if neighbours is None else neighbours
    return near.distance[:, 0] / near.distance[:, count - 1] * np.sqrt(count / np.pi)


def line_spacings(
    positions: npt.NDArray[np.float64], half_width: int = 10
) -> npt.NDArray[np.float64]:
    """Gap after each inner level over the mean gap of its 2 `half_width` nearest gaps, (n - 2,).

    `positions` (n,) sorted. Windows are cut short at the ends.
    """
    gaps = np.diff(positions)
    sums = np.concatenate([[0.0], np.cumsum(gaps)])
    centre = np.arange(1, gaps.size)
    low = np.maximum(0, centre - half_width)
    high = np.minimum(gaps.size, centre + half_width)
    return gaps[centre] * (high - low) / (sums[high] - sums[low])
