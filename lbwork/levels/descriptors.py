"""Per-level quantities whose averages over a spectrum tell the universality classes apart.

In the plane: moments of the complex spacing ratio, of the locally unfolded spacing, and the
squared local field. The last one comes from the picture of levels as charges that repel each other:
the field of the near neighbours on a level fluctuates less, the stronger the repulsion. A smooth
density gradient adds the same constant to the field of near levels, so the product with the mean
field of the surroundings is subtracted and the gradient drops out.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from lbwork.levels.neighbours import Neighbourhood
from lbwork.levels.ratios import complex_spacing_ratios, gap_ratios
from lbwork.levels.spacings import plane_spacings

__all__ = [
    "LINE_NAMES",
    "PLANE_NAMES",
    "RATIO_MOMENTS",
    "line_descriptors",
    "local_field",
    "plane_descriptors",
]

PLANE_NAMES = ("r", "cos", "r2", "r cos", "cos2", "s", "s2", "log s", "field")
RATIO_MOMENTS = 5
"""How many of the plane's descriptors, from the first, are moments of the spacing ratio."""

LINE_NAMES = ("r", "r2", "double", "double2", "triple", "triple2")

_FIELD_NEIGHBOURS = 12
_FIELD_SURROUNDINGS = 24
_DENSITY_NEIGHBOURS = 8
_SMALLEST_SPACING = 0.02  # keeps a few nearly degenerate pairs from ruling the mean of log s


def local_field(near: Neighbourhood) -> npt.NDArray[np.complex128]:
    """f = sum over the 12 nearest of (unit vector to the neighbour) (1 - d^2 / d_13^2), (n,).

    The weight goes to zero at the 13th neighbour, so that f is continuous when neighbours swap.
    """
    steps = near.steps[:, :_FIELD_NEIGHBOURS]
    distance = near.distance[:, :_FIELD_NEIGHBOURS]
    reach = near.distance[:, _FIELD_NEIGHBOURS : _FIELD_NEIGHBOURS + 1]
    return np.sum(steps / distance * (1.0 - (distance / reach) ** 2), axis=1)


def plane_descriptors(near: Neighbourhood) -> npt.NDArray[np.float64]:
    """Descriptors of every level in the order of :data:`PLANE_NAMES`, float64 (n, 9)."""
    ratios = complex_spacing_ratios(near)
    size, angle = np.abs(ratios), np.angle(ratios)
    spacing = plane_spacings(near, _DENSITY_NEIGHBOURS)
    field = local_field(near)
    surroundings = np.mean(field[near.index[:, :_FIELD_SURROUNDINGS]], axis=1)
    own = np.abs(field) ** 2 - np.real(np.conj(field) * surroundings)
    return np.column_stack(
        [
            size,
            np.cos(angle),
            size**2,
            size * np.cos(angle),
            np.cos(2.0 * angle),
            spacing,
            spacing**2,
            np.log(np.maximum(spacing, _SMALLEST_SPACING)),
            own,
        ]
    )


def line_descriptors(positions: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
    """First and second moments of the ratios of single, double and triple gaps, (n - 6, 6).

    `positions` sorted, (n,). The wider gaps see the rigidity that tells a superposition of a few
    blocks from independent levels, where the single gap hardly can.
    """
    columns = []
    for distance, margin in ((1, 2), (2, 1), (3, 0)):
        ratio = gap_ratios(positions, distance)
        ratio = ratio[margin : ratio.size - margin]
        columns += [ratio, ratio**2]
    return np.column_stack(columns)
