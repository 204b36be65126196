"""Random matrices and independent levels of each reference ensemble, seeded by the caller.

Every function takes its generator explicitly; equal generators give equal samples.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy.linalg import eigvals, eigvalsh_tridiagonal

from lbwork.errors import UsageError
from lbwork.levels.cleaning import merge_degenerate

__all__ = [
    "LINE_ENSEMBLES",
    "PLANE_ENSEMBLES",
    "complex_symmetric",
    "ginibre",
    "independent_levels",
    "real_ginibre",
    "sample_levels",
    "self_dual",
]

PLANE_ENSEMBLES = ("poisson", "A", "AI+", "AII+")
LINE_ENSEMBLES = ("1d-poisson", "1d-GOE", "1d-GUE", "1d-GSE")

_DYSON_INDEX = {"1d-GOE": 1, "1d-GUE": 2, "1d-GSE": 4}
_PAIR_TOLERANCE = 1e-8


def ginibre(size: int, generator: np.random.Generator) -> npt.NDArray[np.complex128]:
    """Class A: independent complex Gaussian entries, (size, size), spectrum in the unit disc."""
    real, imaginary = generator.normal(size=(2, size, size))
    return (real + 1j * imaginary) / np.sqrt(2.0 * size)


def real_ginibre(size: int, generator: np.random.Generator) -> npt.NDArray[np.float64]:
    """Independent real Gaussian entries, (size, size), spectrum in the unit disc."""
    return generator.normal(size=(size, size)) / np.sqrt(size)


def complex_symmetric(size: int, generator: np.random.Generator) -> npt.NDArray[np.complex128]:
    """Class AI-dagger: M = M^T, (size, size), spectrum in the unit disc."""
    matrix = ginibre(size, generator)
    return (matrix + matrix.T) / np.sqrt(2.0)


def self_dual(size: int, generator: np.random.Generator) -> npt.NDArray[np.complex128]:
    """Class AII-dagger: M = J M^T J^-1 with J = i sigma_y x 1, (size, size), `size` even.

    M = [[a, b], [c, a^T]] with antisymmetric b and c; every eigenvalue is twofold degenerate.
    Raises UsageError for odd sizes.
    """
    if size % 2:
        raise UsageError(f"a self-dual matrix has an even size, got {size}")
    half = size // 2
    a, b, c = (ginibre(half, generator) for _ in range(3))
    matrix = np.block([[np.sqrt(2.0) * a, b - b.T], [c - c.T, np.sqrt(2.0) * a.T]])
    return (matrix / 2.0).astype(np.complex128)


def independent_levels(count: int, generator: np.random.Generator) -> npt.NDArray[np.complex128]:
    """Independent uniform points of the unit disc: 2D Poisson statistics, (count,)."""
    radius = np.sqrt(generator.uniform(size=count))
    angle = 2.0 * np.pi * generator.uniform(size=count)
    return (radius * np.exp(1j * angle)).astype(np.complex128)


def _tridiagonal(index: int, count: int, generator: np.random.Generator) -> npt.NDArray[np.float64]:
    """Gaussian ensemble of Dyson index `index` as a tridiagonal matrix.

    Source: I. Dumitriu, A. Edelman, J. Math. Phys. 43, 5830 (2002); from memory.
    """
    diagonal = generator.normal(size=count) * np.sqrt(2.0)
    off_diagonal = np.sqrt(generator.chisquare(index * np.arange(count - 1, 0, -1)))
    return eigvalsh_tridiagonal(diagonal / np.sqrt(2.0), off_diagonal / np.sqrt(2.0))


def sample_levels(
    name: str, count: int, generator: np.random.Generator
) -> npt.NDArray[np.complex128]:
    """`count` distinct levels of the ensemble `name`, complex128 (count,).

    Names: :data:`PLANE_ENSEMBLES` and :data:`LINE_ENSEMBLES`; for "AII+" one level of each pair
    of a matrix of twice the size. Raises UsageError for other names.
    """
    if name == "poisson":
        return independent_levels(count, generator)
    if name == "A":
        return eigvals(ginibre(count, generator))
    if name == "AI+":
        return eigvals(complex_symmetric(count, generator))
    if name == "AII+":
        paired = eigvals(self_dual(2 * count, generator))
        return merge_degenerate(paired, _PAIR_TOLERANCE)[0]
    if name == "1d-poisson":
        return np.sort(generator.uniform(size=count)).astype(np.complex128)
    if name in _DYSON_INDEX:
        return _tridiagonal(_DYSON_INDEX[name], count, generator).astype(np.complex128)
    known = ", ".join(PLANE_ENSEMBLES + LINE_ENSEMBLES)
    raise UsageError(f"unknown ensemble '{name}'; known are {known}")
