"""On-site bases in which a generator keeps diagonal density matrices diagonal.

For an on-site unitary w, the diagonal density matrices in the basis ``w |a>`` of every site span a
space that the generator preserves if its leakage vanishes: the part of ``Q p`` outside of the span,
p in the span, on a ring of three sites, so that parts of the density that cancel between bonds do.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import scipy.linalg
import scipy.optimize
import scipy.sparse as sparse

from lbwork import defaults
from lbwork.integrability.density import LocalDensity
from lbwork.integrability.finite_checks import summed_operator

__all__ = ["Leakage", "diagonal_basis"]

_STARTS = {2: 10, 3: 4}


@dataclass(frozen=True, eq=False)
class Leakage:
    """``Q`` on a ring of three sites, csr (n**3, n**3), for on-site bases of dimension d."""

    whole: sparse.csr_matrix
    dimension: int

    @classmethod
    def of(cls, density: LocalDensity) -> Leakage:
        """For a density on doubled sites."""
        dimension = round(np.sqrt(density.dimension))
        ring = summed_operator(density.gauge_fixed, density.dimension, 3, True)
        return cls(ring, dimension)

    def _images(self, unitary: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        site = np.einsum("ka,la->kla", unitary, unitary.conj())
        site = site.reshape(self.dimension**2, self.dimension)
        span = np.kron(np.kron(site, site), site)
        image = self.whole @ span
        inside = span.conj().T @ image
        return image - span @ inside, inside

    def share(self, unitary: np.ndarray) -> float:
        """Norm of the leakage over the norm of Q, both on the ring."""
        outside, _ = self._images(unitary)
        scale = float(sparse.linalg.norm(self.whole))
        return float(np.linalg.norm(outside)) / scale if scale else 0.0

    def motion(self, unitary: np.ndarray) -> float:
        """Norm of what happens within the diagonal density matrices over the norm of Q."""
        _, inside = self._images(unitary)
        scale = float(sparse.linalg.norm(self.whole))
        return float(np.linalg.norm(inside)) / scale if scale else 0.0


def _familiar(dimension: int) -> Iterator[tuple[str, np.ndarray]]:
    yield "z", np.eye(dimension, dtype=complex)
    if dimension == 2:
        yield "x", np.array([[1, 1], [1, -1]]) / np.sqrt(2) + 0j
        yield "y", np.array([[1, 1], [1j, -1j]]) / np.sqrt(2)
    else:
        index = np.arange(dimension)
        yield (
            "Fourier",
            np.exp(2j * np.pi * np.outer(index, index) / dimension) / np.sqrt(dimension),
        )


def _unitary(angles: np.ndarray, dimension: int) -> np.ndarray:
    """``exp(i H)`` with H without diagonal: phases of the basis vectors do not matter."""
    upper = np.triu_indices(dimension, 1)
    matrix = np.zeros((dimension, dimension), dtype=complex)
    half = angles.size // 2
    matrix[upper] = angles[:half] + 1j * angles[half:]
    return np.asarray(scipy.linalg.expm(1j * (matrix + matrix.conj().T)))


def diagonal_basis(
    leakage: Leakage, *, search: bool = True, seed: int = 0
) -> tuple[str, np.ndarray, float]:
    """Name, unitary (d, d) and leakage of the basis that leaks least; familiar ones first.

    A basis with motion is preferred to one in which nothing moves. With ``search`` the leakage is
    minimised from random starts if no familiar basis is closed; minima are local, so that a
    remaining leakage is no proof that there is no basis for d > 2.
    """
    found: list[tuple[str, np.ndarray, float]] = [
        (name, unitary, leakage.share(unitary)) for name, unitary in _familiar(leakage.dimension)
    ]
    closed = [entry for entry in found if entry[2] < defaults.SUBCHAIN_TOLERANCE]
    if not closed and search:
        found += _searched(leakage, seed)
        closed = [entry for entry in found if entry[2] < defaults.SUBCHAIN_TOLERANCE]
    if closed:
        moving = [e for e in closed if leakage.motion(e[1]) > defaults.SUBCHAIN_TOLERANCE]
        return (moving or closed)[0]
    return min(found, key=lambda entry: entry[2])


def _searched(leakage: Leakage, seed: int) -> list[tuple[str, np.ndarray, float]]:
    generator = np.random.default_rng(seed)
    dimension = leakage.dimension
    count = dimension * (dimension - 1)
    found = []
    for _ in range(_STARTS.get(dimension, 2)):
        result = scipy.optimize.least_squares(
            lambda angles: _stacked(leakage, _unitary(angles, dimension)),
            generator.normal(size=count),
            xtol=1e-15,
            ftol=1e-15,
            gtol=1e-15,
            max_nfev=60,
        )
        unitary = _unitary(result.x, dimension)
        share = leakage.share(unitary)
        found.append(("found by search", unitary, share))
        if share < defaults.SUBCHAIN_TOLERANCE:
            break
    return found


def _stacked(leakage: Leakage, unitary: np.ndarray) -> np.ndarray:
    outside, _ = leakage._images(unitary)
    return np.concatenate([outside.real.ravel(), outside.imag.ravel()])
