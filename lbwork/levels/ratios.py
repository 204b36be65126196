"""Spacing ratios: complex ones in the plane, consecutive-gap ratios on a line."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from lbwork.levels.neighbours import Neighbourhood

__all__ = ["complex_spacing_ratios", "gap_ratios"]


def complex_spacing_ratios(near: Neighbourhood) -> npt.NDArray[np.complex128]:
    """z = (nearest - level) / (next nearest - level) of every level, complex128 (n,), |z| <= 1.

    Source: L. Sa, P. Ribeiro, T. Prosen, Phys. Rev. X 10, 021019 (2020).
    """
    steps = near.steps[:, :2]
    return steps[:, 0] / steps[:, 1]


def gap_ratios(positions: npt.NDArray[np.float64], distance: int = 1) -> npt.NDArray[np.float64]:
    """min(r, 1/r) with r = (x_{i+q} - x_i) / (x_i - x_{i-q}), q = `distance`, for sorted x (n,).

    Float64 (n - 2q,). q = 1 is the consecutive-gap ratio of V. Oganesyan, D. Huse, Phys. Rev. B 75,
    155111 (2007); q = 2 sees the rigidity beyond the nearest level.
    """
    after = positions[2 * distance :] - positions[distance:-distance]
    before = positions[distance:-distance] - positions[: -2 * distance]
    return np.minimum(after, before) / np.maximum(after, before)
